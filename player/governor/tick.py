"""One tick: from the strain wanted of every fiber to the strain that is allowed.

A goal is aimed at, moved towards within the rates, and weighed against what lasts longer than a tick: the coil's duty, the
hold above half stroke, the air. What they refuse gets another goal and moves again. The rules that make it lawful always:

- Whatever is allowed leaves the coil enough duty, and the hold enough time, for the whole way down from where the fiber
  then is. So the way down is open at every instant, and where something else would use up what it needs, it is taken.
- A coil that has been switched on stays on for 1 / max_switch_Hz: a fiber that has nothing to do goes one step of its drive
  down and back, and comes to rest only when its coil may be switched off. So nothing ever waits for a coil.
- Air is asked for by filling alone. If the fibers ask for more than there is, each gets the same share of what it asks.
"""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from composer.limits.live import longest_steps, look
from player.engine.ways import SAFE
from player.governor.braked import ZERO, Brakes, braked, brakes_of
from player.governor.causes import ACCEL, AIR, DUTY, HOLD, NONE, RATE, STROKE, SWITCHING
from player.governor.governor import Governor
from player.governor.state import State

_some = np.count_nonzero  # of a mask of few fibers a good deal faster than any()

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]


def govern(governor: Governor, state: State, wanted: Array, dt_s: float, silent: Mask | None = None) -> State:
    """The state at the end of a tick of `dt_s` seconds in which the fibers were wanted at `wanted` (F,).

    wanted: strain, anything at all; what is no number is taken for rest. silent: (F,) fibers whose source has fallen silent;
    they come to rest at their safe rate, whatever is wanted.

    Raises ValueError for a tick longer than the governor was made for; let a longer one pass as several.
    """
    if not 0.0 < dt_s <= governor.live.longest_s * (1.0 + 1e-9):
        raise ValueError(f"a tick of {dt_s} s; this governor is made for ticks above 0 s, at most {governor.live.longest_s} s")
    return _Tick(governor, state, dt_s).to(wanted, silent)


@dataclass(frozen=True, slots=True, eq=False)
class _Lasts:
    """What follows from a governor and how long a tick lasts, (F,) each.

    sure_on_s: as of the governor, at a tick's beginning; kept: of a step of the drive, what a coil that stays on keeps
    given_back_s: what a coil's duty gives back; over_s: as of the governor, at a tick's beginning
    brakes: of the braced fibers; dt, nearly_per_s: one number each, how long it lasts, and nearly one over it
    """

    sure_on_s: Array
    kept: Array
    given_back_s: Array
    over_s: Array
    brakes: Brakes
    dt: Array
    nearly_per_s: Array


@lru_cache(maxsize=16)
def _lasts(governor: Governor, dt_s: float) -> _Lasts:
    return _Lasts(
        governor.sure_on_s - dt_s,
        1.0 - 0.5 * dt_s / governor.min_on_s,
        dt_s * governor.duty,
        governor.over_s - dt_s,
        brakes_of(governor.accel[governor.braced], dt_s),
        np.array(dt_s),
        np.array((1.0 - 1e-9) / dt_s),
    )


class _Tick:
    """What is the same throughout one tick."""

    def __init__(self, governor: Governor, state: State, dt_s: float):
        self.governor, self.state, self.dt_s = governor, state, dt_s
        self.slowed = False
        self.lasts = lasts = _lasts(governor, dt_s)
        self.up, self.down = longest_steps(state.here, lasts.dt, governor.live.steady)
        # A coil that is on, or is switched on now, and may not be switched off at the end of this tick.
        self.too_soon = np.where(state.on, state.since_on_s, ZERO) < lasts.sure_on_s
        self.stays_on = state.on & self.too_soon
        # Where a fiber would stand if it braked now, and the highest strain that it cannot help coming to.
        self.stop = self.top = strain = state.strain
        self.at_rest = strain == ZERO
        self.stands = None
        if governor.has_braced:
            self.stands = state.rate == ZERO
            brakes = np.abs(state.rate)
            brakes *= state.rate
            brakes *= governor.half_per_accel
            brakes += strain
            np.maximum(brakes, ZERO, out=brakes)
            self.stop = np.minimum(brakes, governor.stroke, out=brakes)
            self.top = np.maximum(self.stop, strain)
            b = governor.braced
            self.before = strain[b], state.rate[b], self.stop[b]
            if governor.live.steady:
                self.fill, self.exhaust = state.here.fill[b], state.here.exhaust[b]
            else:
                self._fastest()
        self.idles_on = self.stays_on
        if governor.has_holding:
            self.idles_on = self.stays_on & ~(governor.holding & (strain > governor.least))
        self.start_band = np.where(state.on, ZERO, governor.least)
        self.spent = state.spent_s - lasts.given_back_s if governor.has_duty else state.spent_s
        self.seen: tuple[Array | None, Mask, Array] = (None, state.on, state.spent_s)
        self.cut = np.zeros(len(strain), dtype=np.int8)  # `NONE`

    def to(self, wanted: Array, silent: Mask | None) -> State:
        governor, state = self.governor, self.state
        if silent is not None and not _some(silent):
            silent = None
        within = np.fmin(np.fmax(wanted, ZERO), governor.stroke)
        self._cuts(within != wanted, STROKE)
        numbers = wanted == wanted
        asked = wanted if _some(numbers) == len(wanted) else np.where(numbers, wanted, within)
        let_down, tired, goal = state.let_down, state.tired, within
        if silent is not None:
            goal = np.where(silent, ZERO, goal)
            asked = np.where(silent, ZERO, asked)
        if _some(let_down):
            let_down = let_down & (goal > np.where(self.top <= governor.half, governor.half, governor.let_down_to))
            goal = self._instead(goal, let_down, governor.let_down_to, HOLD)
        if _some(tired):
            goal = self._instead(goal, tired & (goal > self.top), self.top, DUTY)
        if silent is not None:
            self.down = np.where(silent & ~let_down, self.down / SAFE, self.down)
            self.slowed = True

            if governor.has_braced:
                self._fastest()

        strain, rate = self._move(goal)
        self._cuts_on_the_way(goal, strain, rate)
        strain, rate, let_down, tired, share = self._lasting(goal, strain, rate, let_down, tired)
        return self._end(asked, strain, rate, let_down, tired, share)

    def _fastest(self) -> None:
        """Rates of braced fibers up and down in this tick."""
        b = self.governor.braced
        self.fill, self.exhaust = self.up[b] / self.lasts.dt, self.down[b] / self.lasts.dt

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
        idle &= (goal > ZERO) | self.at_rest
        if self.stands is not None:
            idle &= self.stands
        aimed = np.where(idle, strain, goal)
        least = governor.least
        np.subtract(aimed, least, out=aimed, where=idle & self.idles_on)
        low = aimed < least
        low &= self.too_soon
        if _some(low):
            floor = np.minimum(self.stop, least) * self.lasts.kept
            np.maximum(aimed, floor, out=aimed, where=low)
        return aimed

    def _move(self, goal: Array) -> tuple[Array, Array]:
        """Strain and rate at the end of the tick, on the way to a goal."""
        governor, aimed = self.governor, self._aim(goal)
        if governor.all_braced:
            there, rate = braked(*self.before, aimed, self.lasts.brakes, self.fill, self.exhaust)
            np.maximum(there, ZERO, out=there)  # what rounding left outside
            return np.minimum(there, governor.stroke, out=there), rate
        strain = self.state.strain
        there = np.minimum(np.maximum(aimed, strain - self.down), strain + self.up)
        rate = (there - strain) / self.lasts.dt
        if governor.has_braced:
            b = governor.braced
            at, rate[b] = braked(*self.before, aimed[b], self.lasts.brakes, self.fill, self.exhaust)
            there[b] = np.minimum(np.maximum(at, ZERO), governor.stroke[b])
        return there, rate

    def _cuts_on_the_way(self, goal: Array, strain: Array, rate: Array) -> None:
        short = np.abs(goal - strain) > self.governor.least
        if not _some(short):
            return
        self._cuts(short, RATE)
        if self.governor.has_braced:
            most = np.where(rate > ZERO, self.up, self.down)
            short &= np.abs(rate) < most * self.lasts.nearly_per_s
            if not self.governor.all_braced:
                short &= self.governor.half_per_accel > ZERO
            self._cuts(short, ACCEL)

    def _tops(self, strain: Array, rate: Array) -> Array:
        """The highest strain that a fiber at such a strain and rate cannot help coming to."""
        if not self.governor.has_braced:
            return strain
        rising = np.maximum(rate, ZERO)
        rising *= rising
        rising *= self.governor.half_per_accel
        rising += strain
        return rising

    def _back_s(self, strain: Array, rate: Array) -> tuple[Array, Array]:
        """The highest strain that fibers must come to, and seconds from the tick's end to rest at most."""
        here = self.state.here
        top = self._tops(strain, rate)
        back = top - self.state.strain
        np.maximum(back, ZERO, out=back)
        back *= here.back_up
        back += here.back
        if self.governor.has_braced:
            back += np.maximum(rate, ZERO) * (2.0 * self.governor.half_per_accel)
        return top, back

    def _coils(self, strain: Array) -> tuple[Mask, Array]:
        """Whether coils are energised in a tick that ends at `strain`, and what they have spent of their burst then."""
        if self.seen[0] is strain:
            return self.seen[1:]
        governor = self.governor
        on = strain != self.state.strain
        if self.stands is not None:
            on |= ~self.stands
        if governor.has_holding:
            on |= governor.holding & (strain > governor.least)
        spent = self.spent
        if governor.has_duty:
            spent = self.lasts.dt * on
            spent += self.spent
            np.maximum(spent, ZERO, out=spent)
        self.seen = strain, on, spent
        return on, spent

    def _slack(self, strain: Array, rate: Array, back: Array) -> Array:
        """Seconds of its burst that a coil would have left over when the fiber has gone back to rest from there."""
        governor = self.governor
        way = np.maximum(back, governor.min_on_s)
        way += governor.spare_s
        way *= governor.off_duty
        at_rest = strain == ZERO
        if self.stands is not None:
            at_rest &= rate == ZERO
        np.copyto(way, ZERO, where=at_rest)
        way += self._coils(strain)[1]
        return np.subtract(governor.burst_s, way, out=way)

    def _too_long(self, top: Array, back: Array) -> Mask:
        """Whether a hold could not be over in time any more."""
        governor = self.governor
        down = self.state.strain - top
        np.maximum(down, ZERO, out=down)
        down *= self.state.here.back_down
        lasts = self.state.above_s + back
        lasts -= down
        return (lasts > self.lasts.over_s) & (top > governor.half)

    def _above(self, strain: Array) -> Array:
        """Seconds that a hold has lasted at the end of a tick that ends at `strain`."""
        governor, was = self.governor, self.state
        above = was.strain > governor.half
        above &= strain > governor.low
        above |= strain > governor.half
        lasts = was.above_s + self.lasts.dt
        lasts *= above
        return lasts

    def _lasting(
        self, goal: Array, strain: Array, rate: Array, let_down: Mask, tired: Mask
    ) -> tuple[Array, Array, Mask, Mask, float]:
        """Hold, duty and air: what they refuse is let down, or stays where it is, or comes back to rest; air is shared."""
        governor = self.governor
        slack, changed, way_back = None, False, governor.has_duty or governor.has_hold
        top, back = self._back_s(strain, rate) if way_back else (self._tops(strain, rate), None)
        rise = np.maximum(top - self.top, ZERO)
        if governor.has_hold:
            too_long = self._too_long(top, back)
            if _some(too_long):
                let_down = let_down | too_long
                self._cuts(too_long, HOLD)
                rise[too_long] = ZERO
                changed = self._hurry(too_long)
                # One that is on its way down already goes where it went.
                too_long &= goal > governor.let_down_to
                if _some(too_long):
                    goal = np.where(too_long, governor.let_down_to, goal)
                    changed = True
        if governor.has_duty:
            slack = self._slack(strain, rate, back)
            refuse = (slack < governor.spare_on_s) & (rise > ZERO)
            if _some(refuse):
                tired = tired | refuse
                refuse &= goal > self.top
                if _some(refuse):
                    goal = self._instead(goal, refuse, self.top, DUTY)
                    rise[refuse] = ZERO
                    changed = True
        share = self._air_share(rise)
        if share < 1.0:
            fills = rise > ZERO
            goal = self._instead(goal, fills, self.top + share * rise, AIR)
            changed = True
        if changed:
            strain, rate = self._move(goal)
        if slack is not None:
            if changed:
                slack = self._slack(strain, rate, self._back_s(strain, rate)[1])
            forced = slack < ZERO
            if _some(forced):
                tired = tired | forced
                self._cuts(forced, DUTY)
                changed = self._hurry(forced)
                if changed or _some(forced & (goal > ZERO)):
                    strain, rate = self._move(np.where(forced, ZERO, goal))
            if _some(tired):
                tired = tired & (slack < governor.recovered_s) & (self.state.spent_s != ZERO)
        return strain, rate, let_down, tired, share

    def _hurry(self, those: Mask) -> bool:
        """These must come down as fast as they can, silent or not; whether that is news."""
        if not self.slowed:
            return False
        self.down = np.where(those, longest_steps(self.state.here, self.lasts.dt, self.governor.live.steady)[1], self.down)
        if self.governor.has_braced:
            self._fastest()
        return True

    def _air_share(self, rise: Array) -> float:
        """How much of what it takes to rise so far the supply has, 1 for all of it."""
        governor, state = self.governor, self.state
        asked_L = float(rise.dot(state.here.air_up))
        there_L = governor.store_L - state.air_missing_L
        if governor.has_braced:
            there_L -= float((self.top - state.strain).dot(state.here.air_up))
        there_L = max(there_L, 0.0)
        return 1.0 if asked_L <= there_L else there_L / asked_L

    def _end(self, asked: Array, strain: Array, rate: Array, let_down: Mask, tired: Mask, share: float) -> State:
        governor, was, dt_s = self.governor, self.state, self.dt_s
        here = look(governor.live, strain)
        drawn = here.air - was.here.air
        drawn_L = float(np.add.reduce(np.maximum(drawn, ZERO, out=drawn)))
        since_on_s = was.since_on_s + self.lasts.dt
        on, spent = self._coils(strain)
        np.copyto(since_on_s, self.lasts.dt, where=on > was.on)
        by = asked - strain
        near = np.abs(by) <= governor.least
        self._cuts(near, NONE)
        near &= self.stays_on
        if _some(near):
            self._cuts(near & (by != ZERO), SWITCHING)
        return State(
            strain=strain,
            rate=rate,
            here=here,
            on=on,
            since_on_s=since_on_s,
            spent_s=spent,
            tired=tired,
            above_s=self._above(strain) if governor.has_hold else was.above_s,
            let_down=let_down,
            air_missing_L=max(was.air_missing_L - governor.refill_L_s * dt_s, 0.0) + drawn_L,
            cut=self.cut,
            by=by,
            air_share=share,
        )
