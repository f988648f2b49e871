"""The picture of the rehearse window in the manual, and its table of keys.

python tests/pictures/rehearse.py          # makes the picture, offscreen, from a run on the simulator
python tests/pictures/rehearse.py --keys   # prints the table of keys, as the manual has it
"""

import os
import sys
import tempfile
import time
from pathlib import Path

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
HERE = Path(__file__).parents[2]
PICTURE = HERE / "player" / "manual" / "rehearse-window.png"
FROM, SEEN_AT_S = "49:1", 8.5
"""Where playing begins, and how long after it the picture is taken: most of the rig moves."""


def key_table() -> str:
    """The table of keys."""
    from player.window.actions import ACTIONS

    rows = [f"| {', '.join(row.keys)} | {row.word}: {row.says} |" for row in ACTIONS.values() if row.keys]
    return "\n".join(["| key | does |", "| --- | --- |", *rows])


def main() -> None:
    """Take the picture."""
    if "--keys" in sys.argv:
        print(key_table())
        return
    from player.commands import rehearse_ways
    from player.window.start import application
    from player.window.window import RehearseWindow

    with tempfile.TemporaryDirectory() as folder:
        os.environ["XDG_RUNTIME_DIR"] = folder
        os.chdir(HERE / "scores_demo")
        app = application()
        usual = dict.fromkeys(("map_path", "osc", "take", "rate", "log", "rig")) | {"midi": ()}
        window = RehearseWindow(
            rehearse_ways.beginning(score="estuary.score", targets=("sim",), rule="rest", mend=True, start=FROM, **usual)
        )
        window.resize(1280, 800)
        window.show()

        def until(holds, seconds: float = 300.0) -> None:
            end = time.monotonic() + seconds
            while not holds():
                app.processEvents()
                time.sleep(0.002)
                if time.monotonic() > end:
                    raise SystemExit("it did not come")

        until(lambda: window._drawn and window.told.marks is not None and bool(window.margins))
        until(lambda: "done" not in window.margins[0])
        window.do("arm")
        until(lambda: window.now.state == "armed")
        until(lambda: window.parts.deeds["play"].isEnabled())
        window.do("turn")
        began = window.ways.from_s
        until(lambda: window.now.state == "playing" and window.now.number("position_s") >= began + SEEN_AT_S)
        window.grab().save(str(PICTURE))
        window.link.say("stop")
        until(lambda: window.stage == "over")
        window.close()


if __name__ == "__main__":
    main()
