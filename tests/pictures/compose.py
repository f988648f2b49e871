"""The pictures of the compose window in the manual, and its table of keys.

python tests/pictures/compose.py          # makes the pictures, offscreen
python tests/pictures/compose.py --keys   # prints the table of keys, as the manual has it
"""

import os
import sys
import tempfile
import time
from pathlib import Path

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
MANUAL = Path(__file__).parents[2] / "composer" / "manual"


def key_table() -> str:
    """The table of keys."""
    from composer.editor.actions import by_menu, keys_in_words

    lines = ["| key | does | |", "| --- | --- | --- |"]
    for actions in by_menu().values():
        for one in actions:
            if one.keys:
                word = one.word.replace("&", "").removesuffix(" …")
                lines.append(f"| {keys_in_words(one.keys)} | {word} | {one.says} |")
    return "\n".join(lines)


def main() -> None:
    """Take the pictures."""
    if "--keys" in sys.argv:
        print(key_table())
        return
    with tempfile.TemporaryDirectory() as folder:
        os.environ["DRAWCORD_STATE"] = folder
        from composer.editor.start import application, open_window

        app = application()
        window = open_window(None)

        def until(holds, seconds: float = 300.0) -> None:
            end = time.monotonic() + seconds
            while not holds():
                app.processEvents()
                time.sleep(0.005)
                if time.monotonic() > end:
                    raise SystemExit("it did not come")

        known = window.showing.known
        until(lambda: known.checked is not None and known.retimed is not None)
        window.notices.drop("first")
        window.set_theme("dark")
        window.do_next_snag()
        until(lambda: window.snags.mends.choices)
        window.snags.mends.ghost.emit(window.snags.mends.choices[0])
        until(lambda: window.stage.cloth.complete)
        window.pane.clearFocus()
        window.grab().save(str(MANUAL / "compose-window.png"))
        window.snags.mends.ghost.emit(None)
        window.set_theme("light")
        window.do_show_hang()
        until(lambda: known.run is not None and known.run.share >= 1.0)
        window.stage.transport.move_to(103.0)
        window.lists.setCurrentIndex(1)
        until(lambda: True)
        window.grab().save(str(MANUAL / "compose-hang.png"))
        window.pane.document().setModified(False)
        window.close()


if __name__ == "__main__":
    main()
