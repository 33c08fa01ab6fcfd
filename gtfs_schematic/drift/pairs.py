"""Measures over all pairs of stations, in blocks so that large networks fit into memory."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

_BLOCK = 256

Plane = NDArray[np.complex128]
Differences = tuple[NDArray[np.complex128], NDArray[np.complex128]]


def order_flips(ground: Plane, sheet: Plane) -> float:
    """Give the share of (pair, axis) whose order differs between two sets of points, y up.

    Notes
    -----
    Orthogonal order as in Misue, Eades, Lai and Sugiyama 1995 (J. Visual Languages and Computing
    6:183-210). A pair that ties on an axis in either set is left out there; 0 if none is left.
    """
    flips = compared = 0
    for true, drawn in _pairs(ground, sheet):
        for a, b in ((true.real, drawn.real), (true.imag, drawn.imag)):
            sign = np.sign(a) * np.sign(b)
            flips += int(np.count_nonzero(sign < 0))
            compared += int(np.count_nonzero(sign))
    return flips / compared if compared else 0.0


def distance_correlation(ground: Plane, sheet: Plane) -> float:
    """Give Pearson's correlation of true and drawn distance over all pairs; 1 if all are equal."""
    n = len(ground)
    count = n * (n - 1) // 2
    sums = np.zeros(5)
    scale_a, scale_b = np.abs(ground).max() or 1.0, np.abs(sheet).max() or 1.0
    for true, drawn in _pairs(ground / scale_a, sheet / scale_b):
        a, b = np.abs(true), np.abs(drawn)
        sums += (a.sum(), b.sum(), (a * a).sum(), (b * b).sum(), (a * b).sum())
    mean_a, mean_b, aa, bb, ab = sums / max(count, 1)
    spread = (aa - mean_a**2) * (bb - mean_b**2)
    if spread <= 1e-24:
        return 1.0
    return float(np.clip((ab - mean_a * mean_b) / np.sqrt(spread), -1.0, 1.0))


def _pairs(ground: Plane, sheet: Plane) -> Iterator[Differences]:
    """Yield the differences of every pair once, as vectors of matching order."""
    n = len(ground)
    for first in range(0, n, _BLOCK):
        rows = np.arange(first, min(first + _BLOCK, n))
        i, j = np.nonzero(rows[:, None] < np.arange(n)[None, :])
        yield ground[j] - ground[rows[i]], sheet[j] - sheet[rows[i]]
