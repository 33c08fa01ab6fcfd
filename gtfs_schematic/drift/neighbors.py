"""Whether stations keep their neighbours: agreement of the nearest, trustworthiness, continuity."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Plane = NDArray[np.complex128]
Ranks = NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class Neighborhood:
    """Three measures in [0, 1]; 1 if every station keeps its k nearest."""

    agreement: float
    trustworthiness: float
    continuity: float


def neighborhood(ground: Plane, sheet: Plane, k: int) -> Neighborhood:
    """Compare each station's k nearest on the ground with its k nearest as drawn.

    Parameters
    ----------
    ground, sheet
        True and drawn places, any units, shape (n,).
    k
        How many are near; less than half of the stations, else as many as that allows.

    Notes
    -----
    With N(i) and M(i) the k nearest of i on the ground and on the sheet, and r, s the ranks of
    nearness there:

    1. agreement = mean |N(i) ∩ M(i)| / k, chance gives k / (n − 1);
    2. trustworthiness = 1 − 2 / (n k (2n − 3k − 1)) Σ_i Σ_{j in M(i) − N(i)} (r(i, j) − k);
    3. continuity: the same with ground and sheet changed about.

    The latter two are Venna and Kaski's (2001, ICANN, LNCS 2130:485-491). Of equally near
    stations the one that comes first in the diagram is nearer.
    """
    n = len(ground)
    k = min(k, (n - 1) // 2)
    if k < 1:
        return Neighborhood(1.0, 1.0, 1.0)
    true, drawn = _ranks(ground), _ranks(sheet)
    near, seen = true <= k, drawn <= k
    # A station has rank 0 with itself, in both, and counts for neither.
    common = np.count_nonzero(near & seen) - n
    norm = 2.0 / (n * k * (2 * n - 3 * k - 1))
    intruders = np.where(seen & ~near, true - k, 0).sum()
    missing = np.where(near & ~seen, drawn - k, 0).sum()
    return Neighborhood(
        agreement=float(common / (n * k)),
        trustworthiness=float(1.0 - norm * intruders),
        continuity=float(1.0 - norm * missing),
    )


def _ranks(places: Plane) -> Ranks:
    """Give per row the rank of every column by distance; 0 for the row itself."""
    n = len(places)
    ranks = np.empty((n, n), dtype=np.int64)
    order = np.arange(n)
    for i in range(n):
        away = np.abs(places - places[i])
        away[i] = -1.0
        ranks[i, np.argsort(away, kind="stable")] = order
    return ranks
