"""Where a place of the ground comes to lie on the sheet, as the stations and links round it do."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.background.planes import Planes

Floats = NDArray[np.float64]

_BLOCK = 256
_SHARES = (0.25, 0.5, 0.75)
"""Along every piece, places whose image is known beside the stations'."""
_SOFT = 0.15
"""Softening of the weights, in median links: within it a station counts no more than another."""
_PULL = 0.02
"""Weight of the whole drawing's map beside the local one, near to stations; it grows outwards."""
_NEAR = 1.5
"""In median links: so far from all that is drawn, it has twice that weight."""


class Field:
    """The deformation from ground (metres, y north) to sheet (millimetres, y up).

    Notes
    -----
    Moving least squares with affine maps (Schaefer, McPhail and Warren 2006, ACM Trans. Graphics
    25:533-540): at a place p, with weights w_i = (|z_i − p|² + s²)^−2 of stations and places along
    links, z_i, the map of least Σ w_i |L z_i + b − y_i|². A small pull towards the whole drawing's
    best affine map keeps it well-posed where all z_i lie in a row, and sober far from all of them.
    """

    def __init__(self, planes: Planes) -> None:
        ground, sheet = [planes.ground], [planes.sheet]
        for piece in planes.pieces:
            ground.append(np.array([_at_share(piece.ground, share) for share in _SHARES]))
            sheet.append(np.array([_at_share(piece.sheet, share) for share in _SHARES]))
        self.ground, self.sheet = np.vstack(ground), np.vstack(sheet)
        spans = [float(np.linalg.norm(p.ground[1] - p.ground[0])) for p in planes.pieces]
        self._soft = _SOFT * float(np.median(spans))
        self._near = _NEAR * float(np.median(spans))
        size = float(np.ptp(self.ground, axis=0).max())
        a = self.ground - self.ground.mean(axis=0)
        b = self.sheet - self.sheet.mean(axis=0)
        own = a.T @ a + (1e-3 * size) ** 2 * np.eye(2)
        self._whole = np.linalg.solve(own, a.T @ b)

    @property
    def scale_mm_per_m(self) -> float:
        """How much of the sheet a metre takes on average."""
        return float(np.sqrt(abs(np.linalg.det(self._whole))))

    def __call__(self, places: Floats) -> Floats:
        """Give the images of places, shape (n, 2)."""
        blocks = [self._at(places[i : i + _BLOCK]) for i in range(0, len(places), _BLOCK)]
        return np.concatenate(blocks) if blocks else np.empty((0, 2))

    def _at(self, places: Floats) -> Floats:
        away = ((places[:, None, :] - self.ground[None, :, :]) ** 2).sum(axis=2) + self._soft**2
        nearest = away.min(axis=1, keepdims=True)
        w = (nearest / away) ** 2
        total = w.sum(axis=1)[:, None]
        z0, y0 = w @ self.ground / total, w @ self.sheet / total
        a = self.ground[None, :, :] - z0[:, None, :]
        b = self.sheet[None, :, :] - y0[:, None, :]
        share = _PULL * (1.0 + nearest[:, 0] / self._near**2)
        pull = (share * (w * (a**2).sum(axis=2)).sum(axis=1))[:, None, None]
        own = np.einsum("pn,pni,pnj->pij", w, a, a) + pull * np.eye(2)
        both = np.einsum("pn,pni,pnj->pij", w, a, b) + pull * self._whole
        local = np.linalg.solve(own, both)
        return np.asarray(y0 + np.einsum("pi,pij->pj", places - z0, local))


def _at_share(line: Floats, share: float) -> Floats:
    """Give the place at a share of a polyline's length."""
    steps = np.hypot(*np.diff(line, axis=0).T)
    along = np.concatenate([[0.0], np.cumsum(steps)])
    at = share * along[-1]
    return np.array([np.interp(at, along, line[:, 0]), np.interp(at, along, line[:, 1])])
