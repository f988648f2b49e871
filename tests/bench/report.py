"""Every figure that Drawcord is held to, found anew: runs the benches beside this file, tells what was met, what missed.

    python tests/bench/report.py                     # in full: an hour or so on an idle machine
    python tests/bench/report.py --small             # each bench at a small size: whether it still works
    python tests/bench/report.py --only retiming wire --json FILE --png FILE

At a small size figures are told but not judged. Ends with 1 where a bench breaks or no longer says what is looked for,
and in full also where a target is missed.
"""

import argparse
import json
import os
import platform
import re
import subprocess
import sys
import tempfile
import time
from collections.abc import Sequence
from dataclasses import asdict, dataclass
from importlib.metadata import version
from pathlib import Path

from report_table import BENCHES, TARGETS, Bench, Target

HERE = Path(__file__).parent

LONGEST_S = {"small": 300.0, "full": 7200.0}
LIBRARIES = ("numpy", "scipy", "highspy", "PySide6-Essentials", "lark")


@dataclass(frozen=True, slots=True)
class Found:
    """A target and what a bench said: `value` None where it said nothing, `met` None where that is not judged."""

    what: str
    script: str
    holds: str
    target: float
    unit: str
    value: float | None
    met: bool | None

    @property
    def missed_by(self) -> float:
        """How many times worse than the target it is; 1 where it is met."""
        if self.value is None or self.met is not False:
            return 1.0
        over = self.value / self.target if self.holds == "at most" else self.target / max(self.value, 1e-12)
        return over if self.target else float("inf")


def ran(bench: Bench, size: str) -> tuple[str, str]:
    """What a bench says at a size, and why it broke, "" where it did not."""
    arguments = bench.small if size == "small" else bench.full
    with tempfile.TemporaryDirectory() as folder:
        call = [sys.executable, str(HERE / f"{bench.script}.py"), *(one.replace("FOLDER", folder) for one in arguments or ())]
        environment = {**os.environ, "QT_QPA_PLATFORM": "offscreen", "PYTHONPATH": str(HERE.parents[1])}
        try:
            done = subprocess.run(
                call, cwd=HERE.parents[1], capture_output=True, text=True, env=environment, timeout=LONGEST_S[size]
            )
        except subprocess.TimeoutExpired:
            return "", f"it took more than {LONGEST_S[size]:g} s"
    wrong = done.stderr.strip().splitlines()[-1:] or [f"exit code {done.returncode}"]
    return done.stdout, "" if done.returncode == 0 else wrong[0]


def judged(target: Target, said: str, size: str) -> Found:
    """A target beside what its bench said."""
    values = [float(one) for one in re.findall(target.says, said, re.MULTILINE)]
    value = target.of(values) if values else None
    met = None
    if size == "full" and value is not None:
        met = value <= target.bound if target.holds == "at most" else value >= target.bound
    return Found(target.what, target.bench, target.holds, target.bound, target.unit, value, met)


def machine() -> dict[str, object]:
    """What it was found on."""
    model = platform.processor() or platform.machine()
    cpuinfo = Path("/proc/cpuinfo")
    if cpuinfo.exists() and (name := re.search(r"model name\s*: (.*)", cpuinfo.read_text())):
        model = name[1]
    return {
        "processor": model,
        "cores": os.cpu_count(),
        "load": round(os.getloadavg()[0], 2) if hasattr(os, "getloadavg") else None,
        "system": f"{platform.system()} {platform.release()}",
        "python": platform.python_version(),
        **{name: version(name) for name in ("drawcord", *LIBRARIES)},
    }


def number(value: float | None) -> str:
    """A figure in as few digits as say it."""
    return "–" if value is None else f"{value:.3g}" if abs(value) < 1000 else f"{value:.0f}"


def verdict(found: Found) -> str:
    """In a word or two."""
    if found.value is None:
        return "not said"
    if found.met is None:
        return "not judged"
    return "met" if found.met else f"missed, {found.missed_by:.3g} times" if found.missed_by != float("inf") else "missed"


def table(rows: Sequence[Found], about: dict[str, object]) -> str:
    """All of it for a terminal."""
    wide = max(len(row.what) for row in rows)
    lines = [", ".join(f"{name} {value}" for name, value in about.items()), ""]
    lines.append(f"{'what':<{wide}}  {'target':>16} {'found':>9}  {'':<22} script")
    for row in rows:
        wanted = f"{'≤' if row.holds == 'at most' else '≥'} {number(row.target)} {row.unit}".rstrip()
        lines.append(f"{row.what:<{wide}}  {wanted:>16} {number(row.value):>9}  {verdict(row):<22} {row.script}")
    return "\n".join(lines)


def picture(path: Path, rows: Sequence[Found], about: dict[str, object], small: bool) -> None:
    """A bar a target: what was found over what is wanted, by powers of ten; to the left of the line is as wanted."""
    from PySide6.QtCore import QPointF, QRectF, Qt

    from composer.picture import palette
    from composer.picture.look import Look, colour
    from composer.picture.png import drawn, png_bytes

    shown = [row for row in rows if row.value is not None]
    width, each, top, words = 1400, 26, 70, 640
    height = top + each * len(shown) + 30
    middle = words + (width - words) * 0.62
    decade = (width - words) * 0.12

    def draw(painter) -> None:
        look = Look(1.0)
        painter.fillRect(QRectF(0, 0, width, height), colour(palette.GROUND))
        painter.setFont(look.font(13))
        painter.setPen(colour(palette.INK))
        head = f"found over target, a power of ten for each step; {about['processor']}, Python {about['python']}"
        painter.drawText(QPointF(20, 30), head + (", small sizes" if small else ""))
        painter.setPen(colour(palette.FAINT_LINE))
        for step in range(-5, 4):
            x = middle + step * decade
            painter.drawLine(QPointF(x, top - 10), QPointF(x, height - 20))
        for at, row in enumerate(shown):
            y = top + each * at
            over = max(row.value, 1e-9) / max(row.target, 1e-9)
            over = over if row.holds == "at most" else 1.0 / over
            far = max(-5.0, min(3.0, _log10(over)))
            bar = QRectF(min(middle, middle + far * decade), y, abs(far) * decade + 1.0, each - 8)
            painter.fillRect(bar, colour(palette.MISS if over > 1.0 else palette.DUTY))
            painter.setPen(colour(palette.INK))
            place = QRectF(20, y - 4, words - 40, each)
            painter.drawText(place, int(Qt.AlignmentFlag.AlignVCenter | Qt.AlignmentFlag.AlignLeft), row.what)
            place = QRectF(words - 110, y - 4, 100, each)
            said = f"{number(row.value)} {row.unit}".rstrip()
            painter.drawText(place, int(Qt.AlignmentFlag.AlignVCenter | Qt.AlignmentFlag.AlignRight), said)

    path.write_bytes(png_bytes(drawn(draw, width, height)))


def _log10(value: float) -> float:
    from math import log10

    return log10(value)


def main() -> int:
    """Run, print, write."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--small", action="store_true")
    parser.add_argument("--only", nargs="+", metavar="BENCH", choices=[bench.name for bench in BENCHES])
    parser.add_argument("--json", type=Path, metavar="FILE")
    parser.add_argument("--png", type=Path, metavar="FILE")
    asked = parser.parse_args()
    size = "small" if asked.small else "full"
    about, rows, broken, told = machine(), [], [], {}
    for bench in BENCHES:
        if (asked.only and bench.name not in asked.only) or (size == "small" and bench.small is None):
            continue
        begun = time.perf_counter()
        said, why = ran(bench, size)
        took = time.perf_counter() - begun
        print(f"{bench.name}: {why or 'done'}, {took:.0f} s", file=sys.stderr, flush=True)
        told[bench.name] = said
        broken += [f"{bench.name}: {why}"] if why else []
        for target in TARGETS:
            if target.bench == bench.name and (size == "full" or target.small):
                rows.append(judged(target, said, size))
                if rows[-1].value is None and not why:
                    broken.append(f"{bench.name} no longer says: {target.what}")
    if rows:
        print(table(rows, about))
    for line in broken:
        print(line, file=sys.stderr)
    if asked.json:
        whole = {"size": size, "machine": about, "targets": [asdict(row) for row in rows], "broken": broken, "said": told}
        asked.json.write_text(json.dumps(whole, indent=1, ensure_ascii=False) + "\n")
    if asked.png:
        picture(asked.png, rows, about, asked.small)
    return 1 if broken or any(row.met is False for row in rows) else 0


if __name__ == "__main__":
    sys.exit(main())
