"""The local affine field: how the drawing stretches and turns the ground, place by place."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from gtfs_schematic.drift.fit import free_fit
from gtfs_schematic.drift.model import Warp

Plane = NDArray[np.complex128]
Floats = NDArray[np.float64]

_BLOCK = 256
_CELLS = 28
"""Cells of the grid along the longer side of the network."""
_NEAR = 8
"""The field takes in about so many stations round a place."""
_PULL = 0.05
"""Weight of the whole drawing's similarity, so that stations in one row still give a field."""
_REACH = 1.6
"""The field means something up to so many bandwidths from a station."""


class AffineField:
    """Best local affine maps from ground (metres, y up) to sheet (y up).

    Notes
    -----
    At a place p, with Gaussian weights w_i = exp(−|z_i − p|² / 2h²), the affine map z ↦ L z + b
    with the least Σ w_i |L z_i + b − y_i|² + λ |L − S|² is taken: moving least squares
    (Schaefer, McPhail and Warren 2006, ACM Trans. Graphics 25:533-540), after the distortion
    grids of Jenny (2006, Bulletin of the Society of Cartographers 40:15-18). S is the free
    similarity of the whole drawing, λ a small share of Σ w_i h², and h the median distance to
    the eighth nearest station. A drawing that is a similarity image has L = S everywhere.
    """

    def __init__(self, ground: Plane, sheet: Plane) -> None:
        self.ground, self.sheet = ground, sheet
        fit = free_fit(ground, sheet)
        scale = fit.scale_mm_per_km / 1000.0
        self.whole = complex(scale * np.exp(1j * np.radians(fit.rotation_deg)))
        points = np.column_stack([ground.real, ground.imag])
        self._tree = cKDTree(points)
        k = min(_NEAR, len(points) - 1) + 1
        far = self._tree.query(points, k=[k])[0][:, 0]
        self.bandwidth = float(np.median(far)) or float(far.max()) or 1.0

    def at(self, places: Plane) -> tuple[Floats, Plane]:
        """Give local maps and images of some places.

        Returns
        -------
        tuple
            Matrices of shape (n, 2, 2), and images of shape (n,), both with y up.
        """
        blocks = [self._at(places[i : i + _BLOCK]) for i in range(0, len(places), _BLOCK)]
        return (
            np.concatenate([local for local, _ in blocks]),
            np.concatenate([images for _, images in blocks]),
        )

    def _at(self, places: Plane) -> tuple[Floats, Plane]:
        z = places[:, None] - self.ground[None, :]
        away = np.abs(z) ** 2
        # Far from every station the nearest ones still have weight.
        nearest = away.min(axis=1, keepdims=True)
        w = np.exp(-(away - nearest) / (2.0 * self.bandwidth**2))
        total = w.sum(axis=1)
        z0, y0 = (w @ points / total for points in (self.ground, self.sheet))
        dz, dy = self.ground[None, :] - z0[:, None], self.sheet[None, :] - y0[:, None]
        pull = _PULL * total * self.bandwidth**2
        s = self.whole
        similar = np.array([[s.real, -s.imag], [s.imag, s.real]])
        a, b = (np.stack([v.real, v.imag], axis=-1) for v in (dz, dy))
        own = np.einsum("pn,pni,pnj->pij", w, a, a) + pull[:, None, None] * np.eye(2)
        both = np.einsum("pn,pni,pnj->pij", w, b, a) + pull[:, None, None] * similar
        local = both @ np.linalg.inv(own)
        off = places - z0
        moved = np.einsum("pij,pj->pi", local, np.stack([off.real, off.imag], axis=-1))
        return local, y0 + moved[:, 0] + 1j * moved[:, 1]

    def near(self, places: Plane) -> NDArray[np.bool_]:
        """Tell of each place whether a station is near enough for the field to mean something."""
        points = np.column_stack([places.real, places.imag])
        return np.asarray(self._tree.query(points)[0] <= _REACH * self.bandwidth)


def local_scales(field: AffineField) -> tuple[Floats, Floats]:
    """Give each station's local scale and rotation.

    Returns
    -------
    tuple
        √|det L| over the scale of the whole drawing (1 is as everywhere), and the clockwise turn
        of the rotation nearest to L, degrees: atan2(L_yx − L_xy, L_xx + L_yy), negated.
    """
    local, _ = field.at(field.ground)
    size = np.sqrt(np.abs(np.linalg.det(local)))
    turn = np.arctan2(local[:, 1, 0] - local[:, 0, 1], local[:, 0, 0] + local[:, 1, 1])
    return size / (abs(field.whole) or 1.0), -np.degrees(turn)


def warp_of(field: AffineField, scale: float) -> Warp:
    """Lay a square grid on the ground and see where the field takes it.

    Parameters
    ----------
    field
        The local affine field.
    scale
        Of the north-up fit, sheet units per metre: where the grid would lie on a true map.
    """
    z = field.ground
    step = max(float(np.ptp(z.real)), float(np.ptp(z.imag))) / _CELLS
    xs, ys = (_ticks(part, step) for part in (z.real, z.imag))
    nodes = (xs[None, :] + 1j * ys[::-1, None]).ravel()
    _, images = field.at(nodes)
    true = field.sheet.mean() + scale * (nodes - z.mean())
    return Warp(
        columns=len(xs),
        rows=len(ys),
        true_mm=_points(true),
        drawn_mm=_points(images),
        near=tuple(bool(near) for near in field.near(nodes)),
    )


def _ticks(values: Floats, step: float) -> Floats:
    """Cover a range with even steps, half a cell beyond either end and centred."""
    cells = int(np.ceil(float(np.ptp(values)) / step)) + 2
    middle = (float(values.min()) + float(values.max())) / 2.0
    return np.asarray(middle + step * (np.arange(cells + 1) - cells / 2.0), dtype=np.float64)


def _points(places: Plane) -> tuple[tuple[float, float], ...]:
    return tuple((float(p.real), float(-p.imag)) for p in places)
