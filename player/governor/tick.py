"""One tick: from the strain wanted of every fiber to the strain that is allowed.

A goal is aimed at, moved towards within the rates, and weighed against what lasts longer than a tick: the coil's duty, the
hold above half stroke, the air. What they refuse gets another goal and moves again. The rules that make it lawful always:

- Whatever is allowed leaves the coil enough duty, and the hold enough time, for the whole way down from where the fiber
  then is. So the way down is open at every instant, and where something else would use up what it needs, it is taken.
- A coil that has been switched on stays on for 1 / max_switch_Hz: a fiber that has nothing to do goes one step of its drive
  down and back, and comes to rest only when its coil may be switched off. So nothing ever waits for a coil.
- Air is asked for by filling alone. If the fibers ask for more than there is, each gets the same share of what it asks.
"""

import numpy as np
from numpy.typing import NDArray

from composer.limits.live import longest_steps, look
from player.engine.ways import SAFE
from player.governor.braked import braked
from player.governor.causes import ACCEL, AIR, DUTY, HOLD, NONE, RATE, STROKE, SWITCHING
from player.governor.governor import RECOVERED, Governor
from player.governor.state import State

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]

ROUNDING = 1e-7
"""Relative: a coil has been on long enough when it lacks so little; the check forgives ten times as much."""


def govern(governor: Governor, state: State, wanted: Array, dt_s: float, silent: Mask | None = None) -> State:
    """The state at the end of a tick of `dt_s` seconds in which the fibers were wanted at `wanted` (F,).

    wanted: strain, anything at all; what is no number is taken for rest. silent: (F,) fibers whose source has fallen silent;
    they come to rest at their safe rate, whatever is wanted.

    Raises ValueError for a tick longer than the governor was made for; let a longer one pass as several.
    """
    if not 0.0 < dt_s <= governor.live.longest_s * (1.0 + 1e-9):
        raise ValueError(f"a tick of {dt_s} s; this governor is made for ticks above 0 s, at most {governor.live.longest_s} s")
    return _Tick(governor, state, dt_s).to(wanted, silent)


class _Tick:
    """What is the same throughout one tick."""

    def __init__(self, governor: Governor, state: State, dt_s: float):
        self.governor, self.state, self.dt_s = governor, state, dt_s
        self.up, self.down = longest_steps(state.here, dt_s)
        # A coil that is on, or is switched on now, and may not be switched off at the end of this tick.
        on_s = np.where(state.on, state.since_on_s, 0.0)
        self.too_soon = on_s < governor.min_on_s * (1.0 - ROUNDING) - dt_s
        self.stays_on = state.on & self.too_soon
        # Where a fiber would stand if it braked now, and the highest strain that it cannot help coming to.
        self.stop = self.top = strain = state.strain
        if governor.has_braced:
            brakes = 0.5 * state.rate * np.abs(state.rate) * governor.per_accel
            self.stop = np.minimum(np.maximum(strain + brakes, 0.0), governor.stroke)
            self.top = np.maximum(self.stop, strain)
            b = governor.braced
            self.before = strain[b], state.rate[b], self.stop[b]
        self.start_band = np.where(state.on, 0.0, governor.least)
        self.cut = np.zeros(len(strain), dtype=np.int8)  # `NONE`

    def to(self, wanted: Array, silent: Mask | None) -> State:
        governor, state = self.governor, self.state
        within = np.fmin(np.fmax(wanted, 0.0), governor.stroke)
        self._cuts(within != wanted, STROKE)
        asked = np.where(wanted == wanted, wanted, within)
        let_down, tired, goal = state.let_down, state.tired, within
        if silent is not None:
            goal = np.where(silent, 0.0, goal)
            asked = np.where(silent, 0.0, asked)
        if governor.has_hold:
            let_down = let_down & (goal > np.where(self.top <= governor.half, governor.half, governor.let_down_to))
            goal = self._instead(goal, let_down, governor.let_down_to, HOLD)
        if governor.has_duty:
            goal = self._instead(goal, tired & (goal > self.top), self.top, DUTY)
        if silent is not None:
            self.down = np.where(silent & ~let_down, self.down / SAFE, self.down)

        strain, rate = self._move(goal)
        self._cuts_on_the_way(goal, strain, rate)
        goal, strain, rate, let_down, tired = self._lasting(goal, strain, rate, let_down, tired)
        strain, rate, share = self._air(goal, strain, rate)
        return self._end(asked, strain, rate, let_down, tired, share)

    def _instead(self, goal: Array, those: Mask, at: Array, cause: int) -> Array:
        """The goal, for some fibers another one, and why."""
        self._cuts(those, cause)
        return np.where(those, at, goal)

    def _cuts(self, those: Mask, cause: int) -> None:
        np.putmask(self.cut, those, cause)

    def _aim(self, goal: Array) -> Array:
        """The goal as far as coils go: no start for less than a step of the drive, none that ends before it may."""
        governor, strain = self.governor, self.state.strain
        idle = np.abs(goal - strain) <= self.start_band
        idle &= (goal > 0.0) | (strain == 0.0)
        if self.governor.has_braced:
            idle &= self.state.rate == 0.0
        aimed = np.where(idle, strain, goal)
        least = governor.least
        idles = idle & self.stays_on
        if governor.has_holding:
            idles &= ~(governor.holding & (strain > least))
        np.subtract(aimed, least, out=aimed, where=idles)
        low = (aimed < least) & self.too_soon
        if low.any():
            floor = np.minimum(self.stop, least) * (1.0 - 0.5 * self.dt_s / governor.min_on_s)
            aimed = np.where(low, np.maximum(aimed, floor), aimed)
        return aimed

    def _move(self, goal: Array) -> tuple[Array, Array]:
        """Strain and rate at the end of the tick, on the way to a goal."""
        governor, aimed, strain = self.governor, self._aim(goal), self.state.strain
        there = np.minimum(np.maximum(aimed, strain - self.down), strain + self.up)
        rate = (there - strain) / self.dt_s
        if governor.has_braced:
            b = governor.braced
            fill, exhaust = self.up[b] / self.dt_s, self.down[b] / self.dt_s
            at, rate[b] = braked(*self.before, aimed[b], governor.accel[b], fill, exhaust, self.dt_s)
            there[b] = np.minimum(np.maximum(at, 0.0), governor.stroke[b])  # what rounding left outside
        return there, rate

    def _cuts_on_the_way(self, goal: Array, strain: Array, rate: Array) -> None:
        short = np.abs(goal - strain) > self.governor.least
        self._cuts(short, RATE)
        if self.governor.has_braced:
            most = np.where(rate > 0.0, self.up, self.down)
            short &= np.abs(rate) * self.dt_s < most * (1.0 - 1e-9)
            short &= self.governor.per_accel > 0.0
            self._cuts(short, ACCEL)

    def _tops(self, strain: Array, rate: Array) -> Array:
        """The highest strain that a fiber at such a strain and rate cannot help coming to."""
        if not self.governor.has_braced:
            return strain
        rising = np.maximum(rate, 0.0)
        return strain + 0.5 * rising * rising * self.governor.per_accel

    def _back_s(self, strain: Array, rate: Array) -> tuple[Array, Array]:
        """The highest strain that fibers must come to, and seconds from the tick's end to rest at most."""
        here, start = self.state.here, self.state.strain
        top = self._tops(strain, rate)
        back = here.back + np.maximum(top - start, 0.0) * here.back_up
        if self.governor.has_braced:
            back = back + np.maximum(rate, 0.0) * self.governor.per_accel
        return top, back

    def _on(self, strain: Array) -> Mask:
        """Whether coils are energised in a tick that ends at `strain`."""
        on = strain != self.state.strain
        if self.governor.has_braced:
            on |= self.state.rate != 0.0
        if self.governor.has_holding:
            on |= self.governor.holding & (strain > self.governor.least)
        return on

    def _spent(self, on: Mask) -> Array:
        return np.maximum(self.state.spent_s + self.dt_s * (on - self.governor.duty), 0.0)

    def _slack(self, strain: Array, rate: Array, back: Array) -> Array:
        """Seconds of its burst that a coil would have left over when the fiber has gone back to rest from there."""
        governor = self.governor
        way = np.maximum(back, governor.min_on_s) + governor.spare_s
        at_rest = strain == 0.0
        if governor.has_braced:
            at_rest &= rate == 0.0
        way[at_rest] = 0.0
        return governor.burst_s - self._spent(self._on(strain)) - governor.off_duty * way

    def _too_long(self, top: Array, back: Array) -> Mask:
        """Whether a hold could not be over in time any more."""
        governor = self.governor
        down = np.maximum(self.state.strain - top, 0.0) * self.state.here.back_down
        lasts = self.state.above_s + self.dt_s + back - down + governor.late_s - governor.half_back_s
        return (top > governor.half) & (lasts > governor.max_hold_s)

    def _above(self, strain: Array) -> Array:
        """Seconds that a hold has lasted at the end of a tick that ends at `strain`."""
        governor, was = self.governor, self.state
        above = (strain > governor.half) | ((was.strain > governor.half) & (strain > governor.low))
        return np.where(above, was.above_s + self.dt_s, 0.0)

    def _lasting(
        self, goal: Array, strain: Array, rate: Array, let_down: Mask, tired: Mask
    ) -> tuple[Array, Array, Array, Mask, Mask]:
        """Duty and hold: what they refuse is let down, or stays where it is, or comes back to rest."""
        governor = self.governor
        if not (governor.has_duty or governor.has_hold):
            return goal, strain, rate, let_down, tired
        hurried, refused = False, False
        top, back = self._back_s(strain, rate)
        if governor.has_hold:
            too_long = self._too_long(top, back)
            if too_long.any():
                let_down = let_down | too_long
                goal = self._instead(goal, too_long, np.minimum(goal, governor.let_down_to), HOLD)
                hurried = self._hurry(too_long)
        if governor.has_duty:
            spare = governor.off_duty * governor.min_on_s
            slack = self._slack(strain, rate, back)
            refuse = (top > self.top) & (slack < spare)
            refused = bool(refuse.any())
            if refused:
                tired = tired | refuse
                goal = self._instead(goal, refuse & (goal > self.top), self.top, DUTY)
        if hurried or refused:
            strain, rate = self._move(goal)
        if governor.has_duty:
            if hurried or refused:
                slack = self._slack(strain, rate, self._back_s(strain, rate)[1])
            forced = slack < 0.0
            if forced.any():
                tired = tired | forced
                goal = self._instead(goal, forced, np.zeros_like(goal), DUTY)
                self._hurry(forced)
                strain, rate = self._move(goal)
            recovered = (slack >= RECOVERED * governor.burst_s + spare) | (self.state.spent_s == 0.0)
            tired = tired & ~recovered
        return goal, strain, rate, let_down, tired

    def _hurry(self, those: Mask) -> bool:
        """These must come down as fast as they can, silent or not."""
        self.down = np.where(those, longest_steps(self.state.here, self.dt_s)[1], self.down)
        return True

    def _air(self, goal: Array, strain: Array, rate: Array) -> tuple[Array, Array, float]:
        """What the fibers ask of the supply, and where they come to if it has not all of that."""
        governor, state = self.governor, self.state
        rise = np.maximum(self._tops(strain, rate) - self.top, 0.0)
        asked_L = float(np.dot(rise, state.here.air_up))
        there_L = governor.store_L - state.air_missing_L
        if self.governor.has_braced:
            there_L -= float(np.dot(self.top - state.strain, state.here.air_up))
        there_L = max(there_L, 0.0)
        if asked_L <= there_L:
            return strain, rate, 1.0
        share = there_L / asked_L
        fills = rise > 0.0
        self._cuts(fills, AIR)
        return *self._move(np.where(fills, self.top + share * rise, goal)), share

    def _end(self, asked: Array, strain: Array, rate: Array, let_down: Mask, tired: Mask, share: float) -> State:
        governor, was, dt_s = self.governor, self.state, self.dt_s
        here = look(governor.live, strain)
        drawn_L = float(np.maximum(here.air - was.here.air, 0.0).sum())
        on = self._on(strain)
        by = asked - strain
        near = np.abs(by) <= governor.least
        self._cuts(near, NONE)
        self._cuts(near & self.stays_on & (by != 0.0), SWITCHING)
        return State(
            strain=strain,
            rate=rate,
            here=here,
            on=on,
            since_on_s=np.where(on & ~was.on, dt_s, was.since_on_s + dt_s),
            spent_s=self._spent(on) if governor.has_duty else was.spent_s,
            tired=tired,
            above_s=self._above(strain) if governor.has_hold else was.above_s,
            let_down=let_down,
            air_missing_L=max(was.air_missing_L - governor.refill_L_s * dt_s, 0.0) + drawn_L,
            cut=self.cut,
            by=by,
            air_share=share,
        )
