"""Projection of the ground: degrees to local metres round the network's centre."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from pyproj import Transformer


class Projection:
    """Azimuthal equidistant projection about the mean of some places.

    Parameters
    ----------
    lonlat
        Longitude and latitude in degrees, WGS 84.
    """

    def __init__(self, lonlat: Sequence[tuple[float, float]]) -> None:
        lon, lat = np.asarray(lonlat, dtype=np.float64).reshape(-1, 2).mean(axis=0)
        crs = f"+proj=aeqd +lat_0={lat:.9f} +lon_0={lon:.9f} +datum=WGS84 +units=m +no_defs"
        self._to_metres = Transformer.from_crs("EPSG:4326", crs, always_xy=True)

    def __call__(self, lonlat: Sequence[tuple[float, float]]) -> NDArray[np.float64]:
        """Give x east and y north in metres, shape (n, 2)."""
        places = np.asarray(lonlat, dtype=np.float64).reshape(-1, 2)
        x, y = self._to_metres.transform(places[:, 0], places[:, 1])
        return np.round(np.column_stack([x, y]), 4)


def project(lonlat: Sequence[tuple[float, float]]) -> NDArray[np.float64]:
    """Project places to local metres, azimuthal equidistant about their mean.

    Parameters
    ----------
    lonlat
        Longitude and latitude in degrees, WGS 84.

    Returns
    -------
    NDArray
        x east and y north in metres, shape (n, 2).
    """
    if len(lonlat) == 0:
        return np.empty((0, 2))
    return Projection(lonlat)(lonlat)
