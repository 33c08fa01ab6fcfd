"""Local metres on the ground round a network, and the degrees they stand for."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from pyproj import Transformer


@dataclass(frozen=True)
class Ground:
    """Azimuthal equidistant projection (WGS 84) about a centre in degrees.

    Distances from the centre are exact; within a city's extent all others are good to a few
    parts in a hundred thousand.
    """

    lon: float
    lat: float

    @cached_property
    def _transformer(self) -> Transformer:
        crs = (
            f"+proj=aeqd +lat_0={self.lat:.9f} +lon_0={self.lon:.9f} +datum=WGS84 +units=m +no_defs"
        )
        return Transformer.from_crs("EPSG:4326", crs, always_xy=True)

    def metres(
        self, lonlat: Sequence[tuple[float, float]] | NDArray[np.float64]
    ) -> NDArray[np.float64]:
        """Project degrees (n, 2), lon and lat, to local metres (n, 2), x east and y north."""
        places = np.asarray(lonlat, dtype=np.float64).reshape(-1, 2)
        x, y = self._transformer.transform(places[:, 0], places[:, 1])
        return np.column_stack([x, y])

    def degrees(
        self, xy: Sequence[tuple[float, float]] | NDArray[np.float64]
    ) -> NDArray[np.float64]:
        """Give lon and lat in degrees (n, 2) for local metres (n, 2); undoes `metres`."""
        points = np.asarray(xy, dtype=np.float64).reshape(-1, 2)
        lon, lat = self._transformer.transform(points[:, 0], points[:, 1], direction="INVERSE")
        return np.column_stack([lon, lat])


def ground_about(lonlat: Sequence[tuple[float, float]]) -> Ground:
    """Give the ground about the median place; the median shrugs off a few wild coordinates.

    The median is taken on unit vectors, so that a network across the 180° meridian has one too.
    """
    places = np.radians(np.asarray(lonlat, dtype=np.float64).reshape(-1, 2))
    if len(places) == 0:
        return Ground(0.0, 0.0)
    lon, lat = places.T
    vectors = np.column_stack([np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)])
    x, y, z = np.median(vectors, axis=0)
    return Ground(
        float(np.degrees(np.arctan2(y, x))), float(np.degrees(np.arctan2(z, np.hypot(x, y))))
    )
