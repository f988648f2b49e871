"""The host's estimate of a device's clock, from pings and pongs: offset, drift, and a bound on the error.

Of each quarter of a second the exchange with the least round trip is kept (D. L. Mills, "Internet time synchronization: the
network time protocol", IEEE Transactions on Communications 39(10), 1991), for the device's reading then lies within half a
round trip of the middle; a straight line through these, weighted by their round trips, gives offset and drift.
"""

from collections import deque
from dataclasses import dataclass
from math import inf

TURN = 1 << 32
HALF = 1 << 31
WINDOW_S = 20.0
BUCKET_S = 0.25
FEW = 8
"""So many exchanges are each kept for themselves, so that the first seconds have a line too."""
UNKNOWN_PPM = 20_000.0
"""What a device's clock may drift before its drift is known: a bad oscillator, so that the bound holds for it too."""
WANDER_PPM = 2.0
"""What a fitted drift may be off later, through warming and ageing."""
JUMP_US = 50_000.0
SPREAD = 0.03
"""A clock that is off by more than JUMP_US, and more than this share of the time since and what was not known of it anyway, has
been set anew."""


@dataclass(frozen=True, slots=True)
class Exchange:
    """One ping and its pong: the middle in s of the host, the reading in µs unwrapped, half the round trip in µs."""

    host_s: float
    device_us: float
    half_us: float


class Clock:
    """`heard` takes exchanges, the rest answers. Host times in s, device times in µs.

    resets: how often the device's clock was seen to jump, which is a device that has started anew
    """

    def __init__(self) -> None:
        self.resets = 0
        self.forget()

    def forget(self) -> None:
        """As if nothing had been heard: for a device that has started anew."""
        self._kept: deque[Exchange] = deque()
        self._last: Exchange | None = None
        self._at_s = self._offset_us = 0.0
        self._rate = 1e6
        self._slack_ppm = UNKNOWN_PPM

    @property
    def known(self) -> bool:
        """Whether there is an estimate at all."""
        return bool(self._kept)

    @property
    def drift_ppm(self) -> float:
        """By how much the device's clock runs fast."""
        return self._rate - 1e6

    @property
    def round_trip_us(self) -> float:
        """The least round trip in the window."""
        return min((2.0 * kept.half_us for kept in self._kept), default=inf)

    def heard(self, sent_s: float, back_s: float, device_us: int) -> bool:
        """Take a ping sent and answered at these host times; False where it shows that the clock has jumped.

        After a jump the estimate begins anew with this exchange.
        """
        host_s = 0.5 * (sent_s + back_s)
        half_us = max(0.0, back_s - sent_s) * 5e5
        steady = True
        if self._last is not None:
            guess = self.device_us(host_s)
            unwrapped = guess + ((device_us - guess + HALF) % TURN - HALF)
            doubt_us = JUMP_US + half_us + self.bound_us(host_s) + SPREAD * abs(host_s - self._last.host_s) * 1e6
            if abs(unwrapped - guess) > doubt_us:
                self.resets += 1
                self.forget()
                steady = False
            else:
                device_us = unwrapped
        self._last = Exchange(host_s, float(device_us), half_us)
        self._keep(self._last)
        self._fit()
        return steady

    def _keep(self, new: Exchange) -> None:
        kept = self._kept
        same = len(kept) > FEW and int(kept[-1].host_s / BUCKET_S) == int(new.host_s / BUCKET_S)
        if not same:
            kept.append(new)
        elif new.half_us <= kept[-1].half_us:
            kept[-1] = new
        while new.host_s - kept[0].host_s > WINDOW_S:
            kept.popleft()

    def _fit(self) -> None:
        """The line through what is kept; its weights fall with the square of the round trip beyond the least."""
        kept, origin = self._kept, self._kept[-1]
        least = min(one.half_us for one in kept)
        weight = [1.0 / (5.0 + 0.1 * least + one.half_us - least) ** 2 for one in kept]
        x = [one.host_s - origin.host_s for one in kept]
        y = [one.device_us - origin.device_us - 1e6 * dx for one, dx in zip(kept, x, strict=True)]
        total = sum(weight)
        mean_x = sum(w * a for w, a in zip(weight, x, strict=True)) / total
        mean_y = sum(w * b for w, b in zip(weight, y, strict=True)) / total
        spread = sum(w * (a - mean_x) ** 2 for w, a in zip(weight, x, strict=True))
        slope = 0.0
        self._slack_ppm = UNKNOWN_PPM
        if len(kept) >= 3 and x[-1] - x[0] >= 0.2:
            slope = sum(w * (a - mean_x) * b for w, a, b in zip(weight, x, y, strict=True)) / spread
            scatter = sum(w * (b - mean_y - slope * (a - mean_x)) ** 2 for w, a, b in zip(weight, x, y, strict=True))
            error = (scatter / (len(kept) - 2) / spread) ** 0.5
            self._slack_ppm = WANDER_PPM + 3.0 * error
        self._rate = 1e6 + slope
        self._at_s = origin.host_s + mean_x
        self._offset_us = origin.device_us + 1e6 * mean_x + mean_y

    def device_us(self, host_s: float) -> float:
        """The device's clock, unwrapped, at a host time."""
        return self._offset_us + (host_s - self._at_s) * self._rate

    def host_s(self, device_us: int) -> float:
        """The host time of a reading of the device's clock, wrapped, taken within half a turn of the last exchange."""
        last = self._last.device_us if self._last else 0.0
        unwrapped = last + ((device_us - last + HALF) % TURN - HALF)
        return self._at_s + (unwrapped - self._offset_us) / self._rate

    def due_us(self, host_s: float) -> int:
        """What a `set` carries to be applied at a host time: 1 to 2^32 − 1, as 0 would mean now."""
        return round(self.device_us(host_s)) % TURN or 1

    def bound_us(self, host_s: float) -> float:
        """How far `device_us` may be from the truth at a host time; inf before the first exchange.

        Each exchange bounds the truth at its own time by half its round trip, beyond that by what the drift is not known.
        """
        return min(
            (
                one.half_us + abs(one.device_us - self.device_us(one.host_s)) + abs(host_s - one.host_s) * self._slack_ppm
                for one in self._kept
            ),
            default=inf,
        )
