"""Best similarities between two sets of points in the plane, as complex numbers."""

from __future__ import annotations

import cmath
import math

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.drift.model import Fit

Plane = NDArray[np.complex128]


def centred(points: Plane) -> Plane:
    """Move points so that their mean is the origin."""
    return np.asarray(points - points.mean(), dtype=np.complex128)


def free_fit(ground_m: Plane, sheet_mm: Plane) -> Fit:
    """Fit scale, rotation and shift, without reflection.

    Parameters
    ----------
    ground_m
        True places in local metres, y up, shape (n,).
    sheet_mm
        Drawn places in millimetres, y up, shape (n,).

    Notes
    -----
    With both sets centred, c = Σ z̄w / Σ|z|² is the least-squares similarity w ≈ c z, and the
    residual is 1 − |Σ z̄w|² / (Σ|z|² Σ|w|²): Procrustes analysis without reflection (Gower 1975,
    Psychometrika 40:33-51), written with complex numbers.
    """
    z, w = centred(ground_m), centred(sheet_mm)
    product, own, drawn = _sums(z, w)
    c = product / own
    residual = 1.0 - abs(product) ** 2 / (own * drawn)
    return Fit(abs(c) * 1000.0, math.degrees(cmath.phase(c)), _clipped(residual))


def north_up_fit(ground_m: Plane, sheet_mm: Plane) -> Fit:
    """Fit scale and shift only, so that north stays up.

    Notes
    -----
    As `free_fit` with a real factor: s = Re Σ z̄w / Σ|z|², residual 1 − (Re Σ z̄w)² / (Σ|z|² Σ|w|²).
    A negative factor would turn the drawing upside down, so it counts as no likeness at all:
    scale 0, residual 1.
    """
    z, w = centred(ground_m), centred(sheet_mm)
    product, own, drawn = _sums(z, w)
    along = max(product.real, 0.0)
    return Fit(along / own * 1000.0, 0.0, _clipped(1.0 - along**2 / (own * drawn)))


def _sums(z: Plane, w: Plane) -> tuple[complex, float, float]:
    return (
        complex(np.sum(np.conj(z) * w)),
        float(np.sum(np.abs(z) ** 2)),
        float(np.sum(np.abs(w) ** 2)),
    )


def _clipped(residual: float) -> float:
    """Take rounding off the ends of [0, 1]."""
    return min(max(residual, 0.0), 1.0)
