"""Bearing and length change of links, end to end."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.drift.model import LinkDrift
from gtfs_schematic.drift.placed import PlacedLink, PlacedStation

Plane = NDArray[np.complex128]

_SAME_PLACE = 1e-9


def ends_of(stations: Sequence[PlacedStation], links: Sequence[PlacedLink], places: Plane) -> Plane:
    """Give the vector of every link from its first to its second station."""
    index = {station.id: i for i, station in enumerate(stations)}
    ends = np.array([(index[k.start], index[k.end]) for k in links], dtype=np.int64)
    ends = ends.reshape(-1, 2)
    return np.asarray(places[ends[:, 1]] - places[ends[:, 0]], dtype=np.complex128)


def links_drift(links: Sequence[PlacedLink], true: Plane, drawn: Plane) -> tuple[LinkDrift, ...]:
    """Measure every link.

    Parameters
    ----------
    links
        By their stations.
    true, drawn
        Vector of each link on the ground (metres) and on the sheet, both y up.

    Notes
    -----
    Bearing change: −arg(w z̄), degrees in (−180, 180], clockwise. Length ratio: |w| / |z| over
    its median, above 0; 1 is the scale of the typical link.
    """
    usable = (np.abs(true) > _SAME_PLACE) & (np.abs(drawn) > _SAME_PLACE)
    ratio = np.ones(len(links))
    ratio[usable] = np.abs(drawn[usable]) / np.abs(true[usable])
    typical = float(np.median(ratio[usable])) if usable.any() else 1.0
    # The conjugate quotient turns clockwise, as bearings do.
    change = -np.degrees(np.angle(drawn * np.conj(true)))
    change[change <= -180.0] = 180.0
    return tuple(
        LinkDrift(
            link_id=link.id,
            start=link.start,
            end=link.end,
            true_length_m=float(abs(true[i])),
            drawn_length_mm=float(abs(drawn[i])),
            bearing_change_deg=float(change[i]) if usable[i] else None,
            length_ratio=float(ratio[i] / typical) if usable[i] else None,
        )
        for i, link in enumerate(links)
    )
