"""Measure how far a diagram departs from the ground, from an edition's rows alone."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.drift.fit import centred, free_fit, north_up_fit
from gtfs_schematic.drift.ground import local_metres
from gtfs_schematic.drift.model import (
    DriftReport,
    DriftSummary,
    Fit,
    LinkDrift,
    PlacedDiagram,
    PlacedLink,
    PlacedStation,
    StationDrift,
)
from gtfs_schematic.drift.pairs import distance_correlation, order_flips
from gtfs_schematic.errors import EditionError

Plane = NDArray[np.complex128]

_SAME_PLACE = 1e-9


def measure_edition(edition: PlacedDiagram) -> DriftReport:
    """Measure an edition, or anything else that holds placed stations and links."""
    return measure(edition.stations, edition.links)


def measure(stations: Sequence[PlacedStation], links: Sequence[PlacedLink]) -> DriftReport:
    """Measure displacement, bearings, lengths and order of a diagram against the ground.

    Parameters
    ----------
    stations
        Every drawn station; degrees (WGS 84) and sheet millimetres, y down.
    links
        Every drawn link, by station ids.

    Raises
    ------
    EditionError
        If all stations share one place on the ground or on the sheet: nothing can be compared.
    """
    ground = local_metres([(station.lon, station.lat) for station in stations])
    sheet = np.array([complex(station.x_mm, -station.y_mm) for station in stations])
    for points, where in ((ground, "on the ground"), (sheet, "on the sheet")):
        if len(points) == 0 or float(np.abs(points - points[0]).max()) < _SAME_PLACE:
            raise EditionError(
                f"The drift cannot be measured: no two stations have different places {where}. "
                "Draw at least two stations, and check their coordinates."
            )
    north_up, free = north_up_fit(ground, sheet), free_fit(ground, sheet)
    span = (float(np.ptp(ground.real)), float(np.ptp(ground.imag)))
    diagonal = math.hypot(*span)
    moved = _stations(stations, ground, sheet, north_up, diagonal)
    place = {station.id: i for i, station in enumerate(stations)}
    ends = np.array([(place[k.start], place[k.end]) for k in links], dtype=np.int64).reshape(-1, 2)
    true, drawn = ground[ends[:, 1]] - ground[ends[:, 0]], sheet[ends[:, 1]] - sheet[ends[:, 0]]
    changed = _links(links, true, drawn)
    summary = _summary(moved, changed, (order_flips(ground, sheet), ground, sheet))
    return DriftReport(north_up, free, diagonal, moved, changed, summary)


def _stations(
    stations: Sequence[PlacedStation], ground: Plane, sheet: Plane, fit: Fit, diagonal: float
) -> tuple[StationDrift, ...]:
    """Measure each station; a drawing without north-up likeness is measured at its own size."""
    z, w = centred(ground), centred(sheet)
    scale = fit.scale_mm_per_km / 1000.0
    if scale == 0.0:
        scale = float(np.sqrt(np.sum(np.abs(w) ** 2) / np.sum(np.abs(z) ** 2)))
    shift = w / scale - z
    true_mm = sheet.mean() + scale * z
    return tuple(
        StationDrift(
            station_id=station.id,
            name=station.name,
            displacement_m=abs(shift[i]),
            direction_deg=math.degrees(math.atan2(shift[i].real, shift[i].imag)) % 360.0,
            displacement_share=abs(shift[i]) / diagonal,
            drawn_mm=(station.x_mm, station.y_mm),
            true_mm=(float(true_mm[i].real), float(-true_mm[i].imag)),
        )
        for i, station in enumerate(stations)
    )


def _links(links: Sequence[PlacedLink], true: Plane, drawn: Plane) -> tuple[LinkDrift, ...]:
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
            true_length_m=float(abs(true[i])),
            drawn_length_mm=float(abs(drawn[i])),
            bearing_change_deg=float(change[i]) if usable[i] else None,
            length_ratio=float(ratio[i] / typical) if usable[i] else None,
        )
        for i, link in enumerate(links)
    )


def _summary(
    stations: tuple[StationDrift, ...],
    links: tuple[LinkDrift, ...],
    pairs: tuple[float, Plane, Plane],
) -> DriftSummary:
    share = np.array([station.displacement_share for station in stations])
    known = [link for link in links if link.bearing_change_deg is not None]
    change = np.abs([link.bearing_change_deg or 0.0 for link in known])
    weight = np.array([link.true_length_m for link in known])
    ratio = np.array([link.length_ratio or 1.0 for link in known])
    whole = float(weight.sum()) or 1.0
    flips, ground, sheet = pairs
    return DriftSummary(
        displacement_median_share=float(np.median(share)),
        displacement_max_share=float(share.max()),
        bearing_mean_deg=float((change * weight).sum() / whole),
        bearing_p95_deg=float(np.percentile(change, 95.0)) if known else 0.0,
        bearing_over_22_5=float(weight[change > 22.5].sum() / whole),
        bearing_over_45=float(weight[change > 45.0].sum() / whole),
        bearing_over_90=float(weight[change > 90.0].sum() / whole),
        log_length_sd=float(np.log(ratio).std()) if known else 0.0,
        order_flips=flips,
        distance_correlation=distance_correlation(ground, sheet),
    )
