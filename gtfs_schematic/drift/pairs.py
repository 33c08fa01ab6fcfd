"""Measures over all pairs of stations: order, octants, and how distances go together."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray
from scipy.stats import rankdata

_BLOCK = 256
_FLAT = 1e-12

Plane = NDArray[np.complex128]
Floats = NDArray[np.float64]
Differences = tuple[NDArray[np.complex128], NDArray[np.complex128]]


def order_flips(ground: Plane, sheet: Plane) -> float:
    """Give the share of (pair, axis) whose order differs between two sets of points, y up.

    Notes
    -----
    Orthogonal order as in Misue, Eades, Lai and Sugiyama 1995 (J. Visual Languages and Computing
    6:183-210). In [0, 1]: 0 for a stretched map, 0.5 for a mirror image. A pair that ties on an
    axis in either set is left out there; 0 if none is left.
    """
    flips = compared = 0
    for true, drawn in _pairs(ground, sheet):
        for a, b in ((true.real, drawn.real), (true.imag, drawn.imag)):
            sign = np.sign(a) * np.sign(b)
            flips += int(np.count_nonzero(sign < 0))
            compared += int(np.count_nonzero(sign))
    return flips / compared if compared else 0.0


def octant_agreement(ground: Plane, sheet: Plane) -> float:
    """Give the share of pairs that are seen in the same eighth of the compass, y up.

    Notes
    -----
    The octant of a pair is round(β / 45°) mod 8 of its bearing β, so octants are centred on
    north, north-east and so on: what a rider calls a direction. In [0, 1]; chance gives 1/8.
    Pairs that share a place in either set are left out; 1 if none is left.
    """
    same = compared = 0
    for true, drawn in _pairs(ground, sheet):
        usable = (true != 0) & (drawn != 0)
        octants = [np.round(np.angle(v[usable]) / (np.pi / 4)) % 8 for v in (true, drawn)]
        same += int(np.count_nonzero(octants[0] == octants[1]))
        compared += int(np.count_nonzero(usable))
    return same / compared if compared else 1.0


def pair_distances(ground: Plane, sheet: Plane) -> tuple[Floats, Floats]:
    """Give true and drawn distances of all pairs, each pair once, in the units of the points."""
    blocks = [(np.abs(true), np.abs(drawn)) for true, drawn in _pairs(ground, sheet)]
    if not blocks:
        return np.empty(0), np.empty(0)
    return np.concatenate([a for a, _ in blocks]), np.concatenate([b for _, b in blocks])


def pearson(a: Floats, b: Floats) -> float:
    """Give Pearson's correlation, in [-1, 1]; 1 if there is nothing to tell apart.

    Notes
    -----
    r = Σ(a − ā)(b − b̄) / √(Σ(a − ā)² Σ(b − b̄)²) (Pearson 1895, Proc. Royal Society 58:240-242).
    Guo (2011, Transportation Research A 45:625-639) tells 0.22 for true and drawn distance on
    a well-known diagram.
    """
    if len(a) < 2:
        return 1.0
    x, y = _centred(a), _centred(b)
    spread = float((x @ x) * (y @ y))
    if spread <= _FLAT:
        return 1.0
    return float(np.clip((x @ y) / np.sqrt(spread), -1.0, 1.0))


def spearman(a: Floats, b: Floats) -> float:
    """Give Spearman's rank correlation, in [-1, 1]: Pearson's of the ranks, ties at their mean.

    Notes
    -----
    Spearman 1904, American Journal of Psychology 15:72-101.
    """
    return pearson(rankdata(a), rankdata(b)) if len(a) else 1.0


def _centred(values: Floats) -> Floats:
    """Move values to mean 0, in units of the largest, so that no unit is too small to square."""
    unit = float(np.abs(values).max()) or 1.0
    scaled = values / unit
    return np.asarray(scaled - scaled.mean(), dtype=np.float64)


def _pairs(ground: Plane, sheet: Plane) -> Iterator[Differences]:
    """Yield the differences of every pair once, as vectors of matching order."""
    n = len(ground)
    for first in range(0, n, _BLOCK):
        rows = np.arange(first, min(first + _BLOCK, n))
        i, j = np.nonzero(rows[:, None] < np.arange(n)[None, :])
        yield ground[j] - ground[rows[i]], sheet[j] - sheet[rows[i]]
