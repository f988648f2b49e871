"""How long a score takes to read: cold, again after one keystroke, and how the cost grows with its lines; ratios of one run."""

import sys
from time import perf_counter

from composer.score.grammar import parse_line
from composer.score.reading import parse_score


def score(lines: int) -> str:
    """A score of about so many lines, no two alike."""
    phrases = "".join(f"  {n}+1/2  0.{n:05d}  settle over 1/2\n" for n in range(lines // 2))
    entries = "".join(f"  reeds  gather  after {n}/4  canon 1/{n + 1} from middle\n" for n in range(lines // 2))
    return f"tempo 72\nphrase gather\n{phrases}section ebb at 1:1\n{entries}"


def seconds(text: str, *, cold: bool = True) -> float:
    """The shortest of five readings, each from an empty memory if `cold`."""
    best = float("inf")
    for _ in range(5):
        if cold:
            parse_line.cache_clear()
        start = perf_counter()
        parse_score(text, "bench.score")
        best = min(best, perf_counter() - start)
    return best


def main() -> None:
    """Print the ratios."""
    start = perf_counter()
    parse_line("statement", "tempo 72")
    built = perf_counter() - start
    text = score(200)
    cold = seconds(text)
    warm = seconds(text, cold=False)
    print(f"grammar: {built * 1e3:.0f} ms; 200 lines cold: {cold * 1e3:.1f} ms, a keystroke later: {warm / cold:.2f} × that")
    one = cold / 200
    for lines in (2000,) if "--small" in sys.argv else (2000, 20000):
        print(f"{lines} lines: cost a line {seconds(score(lines)) / lines / one:.2f} of that at 200")


if __name__ == "__main__":
    main()
