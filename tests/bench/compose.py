"""The compose window, offscreen: how long keys wait for their echo, the cloth for keys, and a person for the window.

Times are p50 and p95 of one run; beside each what the window is held to, and how often that goes into what was measured.

    python tests/bench/compose.py                 # Estuary, and the window against an empty one
    python tests/bench/compose.py --threads 4096  # also with so many threads open
    python tests/bench/compose.py --moves 1000000 --threads 4096
"""

import argparse
import os
import subprocess
import sys
import tempfile
import time
from pathlib import Path

os.environ["QT_QPA_PLATFORM"] = "offscreen"
sys.path.insert(0, str(Path(__file__).parents[1]))

EMPTY = """
import time
from PySide6.QtWidgets import QApplication, QMainWindow
app = QApplication([])
import pyqtgraph
window = QMainWindow()
window.setCentralWidget(pyqtgraph.PlotWidget())
window.resize(1280, 800)
window.show()
window.grab()
print(time.monotonic(), flush=True)
import os; os._exit(0)
"""

OURS = """
import sys, time
from composer.editor.start import application, open_window
app = application()
window = open_window(sys.argv[1])
app.processEvents()
window.grab()
print(time.monotonic(), flush=True)
while window.showing.known.picture is None:
    app.processEvents()
    time.sleep(0.002)
window.grab()
print(time.monotonic(), flush=True)
window.crew.end()
import os; os._exit(0)
"""

SCORE = """rig many.rig.toml
tempo 96
phrase surge 8
  2    0.6    swell
  3    0.5    linear
  5    0.9    smooth over 1
  8    rest   settle
section all at 1:1
  r.*  surge  times {times} every 8 canon 1/64
section last at 9000:1
  {one}  surge
"""


def opened(code: str, *words: str) -> list[float]:
    """Seconds from the start of a process to each of the instants that it prints."""
    begun = time.monotonic()
    told = subprocess.run([sys.executable, "-c", code, *words], capture_output=True, text=True, check=True).stdout
    return [float(line) - begun for line in told.split()]


def open_times(score: str, rounds: int = 5) -> None:
    """The window on Estuary against an empty window with one plot."""
    empty = sorted(opened(EMPTY)[0] for _ in range(rounds))[rounds // 2]
    ours = sorted(opened(OURS, score) for _ in range(rounds))[rounds // 2]
    print(f"open, over an empty window with a plot: {ours[0] / empty:.2f} (at most 1.5); with its cloth: {ours[1] / empty:.2f}")


class Typist:
    """A window that is typed into."""

    def __init__(self, path: str):
        from composer.editor.start import application, open_window

        self.app = application()
        self.window = open_window(path)
        self.stalls: list[float] = []
        self.until(lambda: self.known.checked is not None, 600)

    @property
    def known(self):
        """What the window knows."""
        return self.window.showing.known

    def until(self, holds, seconds: float = 60.0) -> float:
        """Seconds until something holds."""
        begun = time.perf_counter()
        while not holds():
            step = time.perf_counter()
            self.app.processEvents()
            self.stalls.append(time.perf_counter() - step)
            if step - begun > seconds:
                raise SystemExit("it did not come")
            time.sleep(0.0005)
        return time.perf_counter() - begun

    def type(self, line: int, count: int, wait_for_all: bool = True) -> dict[str, list[float]]:
        """Type digits behind a number in a line and take them back; seconds to echo, cloth, and check with retiming."""
        from PySide6.QtCore import Qt
        from PySide6.QtTest import QTest

        pane, cloth = self.window.pane, self.window.stage.cloth
        pane.go_to(line, len(pane.document().findBlockByNumber(line - 1).text()) + 1)
        took: dict[str, list[float]] = {"echo": [], "cloth": [], "check and retiming": []}
        for number in range(count):
            # What is still to be painted of the key before is not this key's.
            self.app.processEvents()
            begun = time.perf_counter()
            if number % 2:
                QTest.keyClick(pane, Qt.Key.Key_Backspace)
            else:
                QTest.keyClicks(pane, "5")
            pane.viewport().repaint()
            took["echo"].append(time.perf_counter() - begun)
            version = self.window.crew.version
            if wait_for_all:
                self.until(lambda version=version: self.known.picture.version == version, 600)
                cloth.repaint()
                took["cloth"].append(time.perf_counter() - begun)
                self.until(lambda: self.known.checked is not None and self.known.retimed is not None, 600)
                took["check and retiming"].append(time.perf_counter() - begun)
            else:
                self.until(lambda begun=begun: time.perf_counter() - begun > 0.1)
        return took

    def close(self) -> None:
        """Close, with nothing kept."""
        self.window.pane.document().setModified(False)
        self.window.close()


HELD = {"echo": 0.016, "cloth": 0.100, "check and retiming": 0.300}


def tell(title: str, took: dict[str, list[float]], stalls: list[float]) -> None:
    """A line for each kind of wait."""
    print(title)
    for what, times in took.items():
        if times:
            times.sort()
            p50, p95 = times[len(times) // 2], times[int(len(times) * 0.95)]
            print(
                f"  {what:<20} {1e3 * p50:8.1f} {1e3 * p95:8.1f} ms   held to {1e3 * HELD[what]:.0f} ms: {HELD[what] / p95:.2f}"
            )
    print(f"  longest stall of the window's thread {1e3 * max(stalls, default=0.0):.1f} ms (at most 50)")


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser()
    parser.add_argument("--threads", type=int, default=0)
    parser.add_argument("--moves", type=int, default=0)
    parser.add_argument("--keys", type=int, default=60)
    parser.add_argument("--small", action="store_true", help="six keys, each window opened once")
    given = parser.parse_args()
    if given.small:
        given.keys = 6
    import scores_demo

    estuary = Path(scores_demo.__path__[0])
    with tempfile.TemporaryDirectory() as folder:
        os.environ["DRAWCORD_STATE"] = folder
        for name in ("estuary.score", "estuary.rig.toml"):
            (Path(folder) / name).write_bytes((estuary / name).read_bytes())
        path = Path(folder) / "estuary.score"
        open_times(str(path), 1 if given.small else 5)
        typist = Typist(str(path))
        line = (
            path.read_text()
            .split("\n")
            .index("  3      0.35    smooth               # 3 counts in: 35 % of the stroke, moving all the way from the start")
            + 1
        )
        typist.window.pane.replace_columns(line, 14, 200, "")
        typist.until(lambda: typist.known.retimed is not None and typist.known.picture.version == typist.window.crew.version)
        typist.stalls.clear()
        tell("Estuary, a key and then all that follows", typist.type(line, given.keys), typist.stalls)
        typist.stalls.clear()
        tell("Estuary, ten keys a second", typist.type(line, given.keys, wait_for_all=False), typist.stalls)
        typist.close()
        if given.threads:
            from conftest import small_rig

            boards = -(-given.threads // 256)
            rows = tuple((f"r.{n}" if boards > 1 else "r", f"b{n}") for n in range(boards))
            rig = small_rig.__wrapped__()(rows=rows, count=min(given.threads, 256), channels=256)
            (Path(folder) / "many.rig.toml").write_text(rig)
            times = max(1, given.moves // (4 * given.threads))
            (Path(folder) / "many.score").write_text(SCORE.format(times=times, one="r.0.1" if boards > 1 else "r.1"))
            typist = Typist(str(Path(folder) / "many.score"))
            typist.window.pane.go_to(2, 9)
            typist.stalls.clear()
            took = typist.type(2, given.keys, wait_for_all=False)
            tell(f"{given.threads} threads, {typist.known.picture.tracks.moves} moves", took, typist.stalls)
            typist.close()


if __name__ == "__main__":
    main()
