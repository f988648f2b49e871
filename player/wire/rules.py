"""The rules of a device, and what it is, says and reports; device.py carries them out.

Same bytes at the same times give the same bytes and the same values, always. The rules, each of them also in the manual:

1. Starts vented: every channel at 0, which exhausts for every drive. Status 2.
2. A frame is good if it unstuffs, its CRC fits and its type is one of the host's or unknown below 0x80. Others are dropped
   and counted in `bad`; also the device's own types, so that a line that echoes neither feeds the watchdog nor is answered.
3. An unknown type below 0x80 or a body of the wrong form is fault 4, and does not feed the watchdog. All others do.
4. hello: drops the queue, disarms, exhausts, forgets what was configured, status 0. Answered by hello, then state. Of a version
   other than 1 it is answered also by fault 4 (between the two), and counts as no greeting.
5. configure: fault 4 unless greeted and neither armed nor coming to rest, watchdog not 0, channels 1 to what the device has;
   fault 2 where the device knows its rig and this is another: status 3 then. A configure refused leaves the device as it was
   otherwise. Repeated, the last one holds.
6. arm: fault 4 unless the key is right, configure was accepted and the device is not coming to rest. Armed already: nothing
   changes.
7. set: judged in this order: fault 3 unless armed (coming to rest is not armed), fault 4 for no values or a channel not
   configured (the first one is named), then its time: 0, now or past is applied at once, past is counted in `late`; the
   future waits in the queue, fault 5 where that is full. A time is past if it is less than 2^31 µs behind. Sets due at one
   time are applied as they came. A set that faults changes nothing.
8. vent: every channel to 0, queue dropped, status 2, in every state.
9. rest: drops the queue; each channel goes in a straight line, in steps of 1 ms, from where it is to 0, a valve that fills
   beginning from shut; then disarmed, status 0. Status stays 1 on the way. Not armed: nothing changes.
10. Watchdog: armed or coming to rest, and no good frame for watchdog_ms: as vent, and fault 1. Bytes that come at the very end
    of that time come too late.
11. Left by hello only, then configure, arm: status 2 and 3.
12. The device's own faults (over-pressure, sensor): every channel to 0, queue dropped, status 3, the fault said.
13. Order: what a time brings comes before the bytes of that time: sets due (none that is due after the watchdog trips), ramp,
    watchdog, state, sense. Frames are done one after the other, in whatever pieces their bytes came: a state counts what was
    dropped before the frame that it answers, not what follows. Answers carry the seq of what they answer, faults before the
    state; unasked frames carry 0.
14. state: unasked every 50 ms from the start (one where several were missed), and at once where the status changed by itself.
    With it, where it senses strain and is configured, sense for the channels configured.
15. `late` and `bad` count from the start, hello leaves them, and wrap.
"""

from dataclasses import dataclass

from player.wire import messages as m

STATE_EVERY_US = 50_000
RAMP_STEP_US = 1_000
TURN = 1 << 32
HALF = 1 << 31
COUNTER = TURN - 1

REFUSALS: dict[str, tuple[int, str]] = {
    "form": (m.BAD_COMMAND, "no such message, or its body has the wrong size"),
    "version": (m.BAD_COMMAND, "this device speaks version 1"),
    "hello": (m.BAD_COMMAND, "hello has to come first"),
    "armed": (m.BAD_COMMAND, "configure while armed"),
    "watchdog": (m.BAD_COMMAND, "a watchdog of 0 ms"),
    "channels": (m.BAD_COMMAND, "more channels than there are, or none"),
    "rig": (m.RIG_MISMATCH, "this device serves another rig"),
    "key": (m.BAD_COMMAND, "wrong key"),
    "configure": (m.BAD_COMMAND, "configure has to come first"),
    "resting": (m.BAD_COMMAND, "arm while coming to rest"),
    "unarmed": (m.NOT_ARMED, "set while not armed"),
    "empty": (m.BAD_COMMAND, "set of no values"),
    "channel": (m.BAD_COMMAND, "set of a channel that is not configured"),
    "full": (m.QUEUE_FULL, "the queue is full"),
    "silence": (m.WATCHDOG, "no frame from the host"),
}
"""What a device has to refuse or to report: code of the fault and its text, which is always the same."""


@dataclass(frozen=True, slots=True)
class Build:
    """What a device is: its name, the drive of each channel, room in its queue, what it senses, the rig it knows (or None)."""

    name: str
    drives: tuple[str, ...]
    queue: int = 64
    senses_strain: bool = False
    senses_supply: bool = False
    rig: int | None = None

    def __post_init__(self) -> None:
        """Raises ValueError for what a hello could not say."""
        if not 1 <= len(self.drives) <= 0xFFFF or not 64 <= self.queue <= 0xFFFF or len(self.name.encode()) > 255:
            raise ValueError("a device has 1 to 65535 channels, room for 64 to 65535 sets, a name of at most 255 bytes")


@dataclass(frozen=True, slots=True)
class Applied:
    """A set that has moved valves; times in µs of the device, `late` where it came after its due time. Due 0 means now."""

    arrival_us: int
    due_us: int
    first: int
    count: int
    late: bool


@dataclass(frozen=True, slots=True)
class Changed:
    """The status is another than before, and why."""

    was: int
    now: int
    why: str


@dataclass(frozen=True, slots=True)
class Told:
    """A fault that was told to the host."""

    code: int
    channel: int
    text: str


Event = Applied | Changed | Told
