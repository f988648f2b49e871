"""Whether fits keep their word: of so many noisy repeats of the invented bench, how often the true values lie within the
uncertainty that the fit itself states; each parameter by itself, and all at once.

    python tests/bench/fitting.py [REPEATS]
"""

import sys
from pathlib import Path
from time import perf_counter

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1] / "composer" / "fit"))

import synthetic

from composer.fit.fitting import fit
from composer.fit.reading import read_bench


def main(repeats: int) -> None:
    """Print the table."""
    clean = synthetic.exact()
    inside: dict[str, int] = {}
    values: dict[str, list[float]] = {}
    half: dict[str, list[float]] = {}
    together = 0
    begin = perf_counter()
    for seed in range(repeats):
        bench = read_bench(synthetic.text(synthetic.noisy(clean, 1000 + seed), synthetic.HEAD), "bench.csv")
        found = fit(bench, "reed").found
        good = [one.low <= synthetic.TRUE[one.key] <= one.high for one in found]
        together += all(good)
        for one, lies in zip(found, good, strict=True):
            inside[one.key] = inside.get(one.key, 0) + lies
            values.setdefault(one.key, []).append(one.value)
            half.setdefault(one.key, []).append((one.high - one.low) / 2.0)
    share = (perf_counter() - begin) / repeats / clean[0][-1]
    print(f"{repeats} repeats of {len(clean[0])} rows; a fit takes {share:.2g} of the time that the bench took")
    print(f"{'parameter':<20} {'true':>9} {'mean':>10} {'spread':>9} {'stated':>9} {'inside':>7}")
    for key, lies in inside.items():
        mean, spread = np.mean(values[key]), np.std(values[key])
        print(f"{key:<20} {synthetic.TRUE[key]:>9g} {mean:>10.5g} {spread:>9.2g} {np.mean(half[key]):>9.2g} {lies:>7}")
    print(f"all at once: {together} of {repeats}")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 100)
