"""OSC out: the player's state, cues passed and what the governor cuts, as packets. No socket in here."""

from pythonosc.osc_message_builder import OscMessageBuilder

STATE, CUE, SNAG = "/drawcord/state", "/drawcord/cue", "/drawcord/snag"

OUT = {
    STATE: ("s f f", "state of the player; place in s from the score's start; counts a minute, 0 where none runs"),
    CUE: ("s f", "a cue that has been passed, and its place in s"),
    SNAG: (
        "s s f",
        'what the governor cuts: the limit, the fiber ("" for the rig\'s air), by how much, as a share from 0 to 1',
    ),
}
"""Addresses that are sent: types of the arguments, and what they say."""

EVERY_S = 0.05
"""Least time between two packets of one address and fiber; a change of state goes at once."""

MOST_SNAGS = 20
"""Snags sent in one such time; the fibers that are cut most."""


class OscOut:
    """Says what is new; the caller sends the packets."""

    def __init__(self) -> None:
        self._state = ""
        self._state_s = -1.0
        self._cue = ""
        self._snags_s = -1.0

    def packets(
        self,
        now_s: float,
        state: str,
        place_s: float,
        rate: float = 0.0,
        cue: tuple[str, float] | None = None,
        cuts: tuple[tuple[str, str, float], ...] = (),
    ) -> list[bytes]:
        """Packets to send after a tick.

        Args:
            now_s: seconds of the caller's steady clock
            state, place_s, rate: of the player; counts a minute
            cue: the last cue passed and its place in s
            cuts: limit, fiber and share cut, for each fiber that the governor holds back
        """
        out: list[bytes] = []
        if state != self._state or now_s - self._state_s >= EVERY_S:
            self._state, self._state_s = state, now_s
            out.append(_packet(STATE, (state, "s"), (place_s, "f"), (rate, "f")))
        if cue is not None and cue[0] != self._cue:
            self._cue = cue[0]
            out.append(_packet(CUE, (cue[0], "s"), (cue[1], "f")))
        if cuts and now_s - self._snags_s >= EVERY_S:
            self._snags_s = now_s
            for limit, fiber, share in sorted(cuts, key=lambda cut: -cut[2])[:MOST_SNAGS]:
                out.append(_packet(SNAG, (limit, "s"), (fiber, "s"), (share, "f")))
        return out


def _packet(address: str, *arguments: tuple[str | float, str]) -> bytes:
    builder = OscMessageBuilder(address)
    for value, letter in arguments:
        builder.add_arg(value, letter)
    return builder.build().dgram
