"""All the outputs of a run as one: a verb goes to each that still answers, and one that is lost takes no other with it."""

from collections.abc import Callable, Mapping, Sequence

from composer.faults import Faults
from player.engine.quiet import collect_now
from player.outputs.base import Array, Event, LinkLost, Output

VENTED = ("vented", "fault")
DISARMED = ("idle", *VENTED)
"""What a board says that does not follow sets: at rest, or with every channel exhausted."""


class Boards:
    """The outputs of a run. Every verb returns events; that of a link just lost has the kind "lost"."""

    def __init__(self, outputs: Sequence[Output]):
        self.outputs = tuple(outputs)
        self._lost: dict[int, str] = {}
        self._state = ["closed"] * len(self.outputs)

    @property
    def live(self) -> tuple[Output, ...]:
        """Those whose link is there."""
        return tuple(output for number, output in enumerate(self.outputs) if number not in self._lost)

    @property
    def links(self) -> tuple[tuple[str, str], ...]:
        """Drivers and state of each, for the operator."""
        return tuple(("+".join(output.drivers), state) for output, state in zip(self.outputs, self._state, strict=True))

    def send(self, due_s: float, command: Array) -> list[Event]:
        """The same set to every board, for the same instant."""
        return self._each(lambda output: output.send(due_s, command))

    def arm(self) -> list[Event]:
        """Arm every board."""
        collect_now()
        return self._each(lambda output: output.arm(), "armed", sure=True)

    def rest(self, over_s: float) -> list[Event]:
        """Every board to rest, and disarmed."""
        return self._each(lambda output: output.rest(over_s), "idle")

    def vent(self) -> list[Event]:
        """Vent every board."""
        return self._each(lambda output: output.vent(), "vented")

    def reattach(self) -> tuple[list[str], list[str]]:
        """Take hold again of those that are lost; what to tell of those that were found, and of those that were not."""
        found, missing = [], []
        for number in sorted(self._lost):
            output = self.outputs[number]
            try:
                found.append(f"{'+'.join(output.drivers)} is found again at {output.reattach()}")
            except LinkLost as why:
                missing.append(f"{'+'.join(output.drivers)}: {why}")
                continue
            del self._lost[number]
            self._state[number] = "idle"
        return found, missing

    def poll(self) -> list[Event]:
        """What has come in from all of them."""
        heard: list[Event] = []
        lost = self._each(lambda output: heard.extend(output.poll()))
        for event in heard:
            for number, output in enumerate(self.outputs):
                if event.kind == "state" and event.driver in output.drivers and number not in self._lost:
                    self._state[number] = event.status
        return heard + lost

    def settled(self, status: str) -> bool:
        """Whether every board that still answers, and has to be armed, says that it is in that state; one that has vented by
        itself is disarmed, so it does for "idle" too."""
        return not self.unsettled(status)

    def unsettled(self, status: str) -> list[str]:
        """Those of which it is not so, by their drivers."""
        enough = DISARMED if status == "idle" else (status,)
        return ["+".join(self.outputs[number].drivers) for number in self._real if self._state[number] not in enough]

    @property
    def vented(self) -> bool:
        """Whether a board that still answers says that it has vented."""
        return any(self._state[number] in VENTED for number in self._real)

    @property
    def moves(self) -> bool:
        """Whether there is anything left that would follow a set: a board that is armed, or an output that is no board."""
        real = self._real
        return any(
            number not in self._lost and (number not in real or self._state[number] not in DISARMED)
            for number in range(len(self.outputs))
        )

    @property
    def _real(self) -> list[int]:
        return [number for number, output in enumerate(self.outputs) if number not in self._lost and output.must_arm]

    def sensing(self, newest_s: Mapping[str, float], until_s: float) -> bool:
        """Whether a board that senses, and still answers, has not sensed anything from that time on; newest_s: by driver."""
        return any(
            newest_s[driver] < until_s
            for output in self.live
            for driver in output.drivers
            if output.must_arm and driver in newest_s
        )

    def close(self) -> list[Event]:
        """Let go of all of them, lost ones too; what could not be finished comes back as events."""
        failed = []
        for output in self.outputs:
            try:
                output.close()
            except (LinkLost, Faults, OSError) as why:
                failed.append(Event("lost", output.drivers[0], str(why)))
        return failed

    def _each(self, deed: Callable[[Output], None], state: str = "", sure: bool = False) -> list[Event]:
        """Do it with each; the state that follows is taken as read only where `sure`, or where there is no board to say it."""
        lost = []
        for number, output in enumerate(self.outputs):
            if number in self._lost:
                continue
            try:
                deed(output)
                if state and (sure or not output.must_arm):
                    self._state[number] = state
            except LinkLost as gone:
                self._lost[number], self._state[number] = str(gone), "lost"
                lost += [Event("lost", driver, str(gone)) for driver in output.drivers]
        return lost
