"""How well data tell parameters: covariance of a robust fit, with residuals that may hang together from row to row."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.stats import t as student

Array = NDArray[np.float64]

NULL = 1e-9
"""Singular values below this share of the largest are directions of which the data say nothing."""


@dataclass(frozen=True, slots=True, eq=False)
class Uncertainty:
    """How well parameters are told.

    half: (P,) to either side, so that all intervals hold at once at the confidence asked for; correlation: (P, P)
    scale: standard deviation left over; blind: (P,) whether a parameter leans on a direction of which the data say nothing
    """

    half: Array
    correlation: Array
    scale: float
    blind: NDArray[np.bool_]


def robust_scale(residual: Array) -> float:
    """Standard deviation of the bulk of residuals: 1.4826 times their median distance from the median."""
    return float(1.4826 * np.median(np.abs(residual - np.median(residual))))


def hanging_together(residual: Array) -> float:
    """Rows that count as one because neighbours err alike: the integrated autocorrelation, at least 1.

    Summed in pairs as long as a pair is positive (Geyer 1992, initial positive sequence).
    """
    count = len(residual)
    centred = residual - residual.mean()
    size = 1 << (2 * count - 1).bit_length()
    power = np.abs(np.fft.rfft(centred, size)) ** 2
    covariance = np.fft.irfft(power, size)[: max(count // 4, 2)]
    if covariance[0] <= 0.0:
        return 1.0
    pairs = covariance[: len(covariance) // 2 * 2].reshape(-1, 2).sum(axis=1) / covariance[0]
    ends = np.flatnonzero(pairs <= 0.0)
    return max(1.0, float(2.0 * pairs[: ends[0] if len(ends) else None].sum() - 1.0))


def uncertainty(residual: Array, jacobian: Array, soft: float, confidence: float, shaken: Array) -> Uncertainty:
    """Of a fit that minimises the soft_l1 loss of `residual` (N,) with scale `soft`; `jacobian` (N, P) of the residuals.

    shaken: (B, N) what the residual changes by where the measured drive has B other draws of its noise, none for no noise

    An M-estimator's covariance (Huber 1981): mean psi² over the squared mean of psi', times the inverse of J'J, times the
    rows that count as one; Student's t for what is left of them. The intervals hold together (Bonferroni's inequality).
    """
    rows, count = jacobian.shape
    u2 = (residual / soft) ** 2
    psi = residual / np.sqrt(1.0 + u2)
    slope = float(np.mean((1.0 + u2) ** -1.5))
    alike = hanging_together(psi)
    free = max(rows / alike - count, 1.0)
    variance = float(np.mean(psi**2)) / slope**2 * rows / max(rows - count, 1) * alike
    _, singular, across = np.linalg.svd(jacobian, full_matrices=False)
    floor = max(NULL * float(singular[0]), 1e-300)
    nothing = singular < floor
    covariance = (across.T / np.maximum(singular, floor) ** 2) @ across * variance
    if len(shaken):
        # Noise of the drive enters through friction's memory too, where residuals show little of it: so it is played through.
        moved = np.linalg.lstsq(jacobian, shaken.T, rcond=NULL)[0]
        covariance = covariance + moved @ moved.T / len(shaken)
    deviation = np.sqrt(np.maximum(np.diag(covariance), 1e-300))
    return Uncertainty(
        half=deviation * float(student.ppf(1.0 - (1.0 - confidence) / (2.0 * count), free)),
        correlation=covariance / deviation[:, None] / deviation[None, :],
        scale=robust_scale(residual),
        blind=(np.abs(across[nothing]) > 0.1).any(axis=0) if nothing.any() else np.zeros(count, dtype=bool),
    )
