"""Measured pressure without its noise: a sensor's noise must not be taken for the fiber's own to and fro.

Friction remembers the extremes of pressure, and the extreme of a noisy signal lies beyond that of the true one.
"""

import numpy as np
from numpy.typing import NDArray
from scipy.stats import chi2

Array = NDArray[np.float64]

WINDOWS = (5, 9, 15, 25, 49, 99)
"""Rows that a line may be laid through."""

TOLERATED = 0.95
"""A line is believed where the rows under it stray no further than noise does in so many cases."""

CLOSE = 5
ASIDE = 2.0
"""Nor is it where the nearest CLOSE rows lie more than so many standard errors to one side: a corner just passed."""


def noise(values: Array) -> float:
    """Standard deviation of the white noise in a signal, from its third differences, which trends hardly enter.

    Robust: 1.4826 times the median size, over the sqrt(20) that third differences make of white noise.
    """
    return float(1.4826 * np.median(np.abs(np.diff(values, 3))) / np.sqrt(20.0)) if len(values) > 6 else 0.0


def smoothed(values: Array) -> Array:
    """The signal (N,) smoothed by local lines, each row by the surest line that the rows under it do not contradict.

    A line may have its row in the middle or at either end, so that corners stay sharp: ramps and stands are smoothed up to
    the corner from their own side (local polynomials with the widest window that the noise allows, after Goldenshluger and
    Nemirovski 1997). Where no line will do, the signal stays as it is.
    """
    level = noise(values)
    if level == 0.0:
        return values
    smooth, done = values.copy(), np.zeros(len(values), dtype=bool)
    middle = values.mean()
    lines = {size: _lines(values - middle, size) for size in WINDOWS if size <= len(values)}
    around = np.convolve(values - middle, np.full(CLOSE, 1.0 / CLOSE), mode="valid")
    places = ((_variance(n, place), n, place) for n in lines for place in (0, n // 2, n - 1))
    for _, size, place in sorted(places):
        mean, slope, strays = lines[size]
        near = min(max(place - CLOSE // 2, 0), size - CLOSE)
        aside = around[near : near + len(mean)] - (mean + slope * (near + CLOSE // 2 - (size - 1) / 2.0))
        good = (strays <= level**2 * chi2.ppf(TOLERATED, size - 2)) & (np.abs(aside) <= ASIDE * level / np.sqrt(CLOSE))
        rows = np.flatnonzero(good) + place
        new = rows[~done[rows]]
        smooth[new] = (mean + slope * (place - (size - 1) / 2.0))[new - place] + middle
        done[new] = True
    return smooth


def _lines(values: Array, size: int) -> tuple[Array, Array, Array]:
    """Mean, slope a row and squared distance, summed, of the line through each run of `size` rows: (N − size + 1,) each."""
    place = np.arange(size) - (size - 1) / 2.0
    square = float(place @ place)
    mean = np.convolve(values, np.full(size, 1.0 / size), mode="valid")
    slope = np.convolve(values, place[::-1] / square, mode="valid")
    squares = np.convolve(values**2, np.ones(size), mode="valid")
    return mean, slope, np.maximum(squares - size * mean**2 - square * slope**2, 0.0)


def _variance(size: int, place: int) -> float:
    """Variance of a line's value at one of its rows, as a share of that of one row."""
    apart = place - (size - 1) / 2.0
    return 1.0 / size + apart**2 / (size * (size**2 - 1) / 12.0)


def turns(values: Array, least: float) -> NDArray[np.int64]:
    """Indices of the first row and of every row where a signal turns back by at least `least`, rising.

    A signal that stays within `least` turns nowhere.
    """
    found = [0]
    low = high = 0
    going = 0
    row = values.tolist()
    for now, value in enumerate(row):
        if value > row[high]:
            high = now
        if value < row[low]:
            low = now
        if going >= 0 and row[high] - value > least:
            if high > found[-1]:
                found.append(high)
            going, low, high = -1, now, now
        elif going <= 0 and value - row[low] > least:
            if low > found[-1]:
                found.append(low)
            going, low, high = 1, now, now
    return np.array(found, dtype=np.int64)


def levelled(values: Array, turn: NDArray[np.int64], near: float) -> Array:
    """The signal (N,) with each turn's peak cut to the median of the rows beside it that lie within `near` of it.

    The greatest of many rows with some noise left lies above what they all stand for.
    """
    flat = values.copy()
    for number, row in enumerate(turn[1:], 1):
        before = turn[number - 1]
        after = turn[number + 1] if number + 1 < len(turn) else len(values) - 1
        close = np.abs(values[before : after + 1] - values[row]) <= near
        here = row - before
        away_left = np.flatnonzero(~close[:here])
        away_right = np.flatnonzero(~close[here:])
        first = before + (away_left[-1] + 1 if len(away_left) else 0)
        last = row + (away_right[0] if len(away_right) else len(close) - here)
        run = slice(first, last)
        cut = np.minimum if values[row] > values[before] else np.maximum
        flat[run] = cut(flat[run], np.median(values[run]))
    return flat
