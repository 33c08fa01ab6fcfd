"""Measure how far a diagram departs from the ground, from an edition's rows alone."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.drift.competing import competing_routes
from gtfs_schematic.drift.fit import centred, free_fit, north_up_fit
from gtfs_schematic.drift.ground import local_metres
from gtfs_schematic.drift.journeys import measure_journeys
from gtfs_schematic.drift.links import ends_of, links_drift
from gtfs_schematic.drift.lookalikes import Places, false_neighbors, hidden_walks
from gtfs_schematic.drift.model import DriftReport, DriftSettings, Fit, StationDrift
from gtfs_schematic.drift.placed import Diagram, PlacedLink, PlacedStation
from gtfs_schematic.drift.rides import typical_length
from gtfs_schematic.drift.rounded import rounded
from gtfs_schematic.drift.summary import summary_of
from gtfs_schematic.drift.warp import AffineField, local_scales, warp_of
from gtfs_schematic.errors import EditionError

Plane = NDArray[np.complex128]

_SAME_PLACE = 1e-9


def measure_edition(edition: Diagram, settings: DriftSettings | None = None) -> DriftReport:
    """Measure an edition, or any other whole diagram, and whom it misleads.

    Parameters
    ----------
    edition
        Stations, links, walks and lines; journeys are measured if it holds a timetable.
    settings
        Thresholds; None for the defaults.

    Raises
    ------
    EditionError
        As `measure` does.
    """
    settings = settings or DriftSettings()
    report = measure(edition.stations, edition.links, settings)
    known = [link for link in report.links if link.length_ratio is not None]
    if not known:
        return rounded(report)
    ground, sheet = _places(edition.stations)
    scale = float(np.median([link.drawn_length_mm / link.true_length_m for link in known]))
    places = Places(ground, sheet, scale)
    return rounded(
        replace(
            report,
            typical_link_mm=typical_length(edition.links),
            false_neighbors=false_neighbors(edition, places, settings),
            hidden_walks=hidden_walks(edition, places, settings),
            competing=competing_routes(edition, places, settings),
            journeys=measure_journeys(edition, settings),
        )
    )


def measure(
    stations: Sequence[PlacedStation],
    links: Sequence[PlacedLink],
    settings: DriftSettings | None = None,
) -> DriftReport:
    """Measure displacement, bearings, lengths and order of a diagram against the ground.

    Parameters
    ----------
    stations
        Every drawn station; degrees (WGS 84) and sheet millimetres, y down.
    links
        Every drawn link, by station ids.
    settings
        Thresholds; None for the defaults.

    Raises
    ------
    EditionError
        If all stations share one place on the ground or on the sheet: nothing can be compared.
    """
    settings = settings or DriftSettings()
    ground, sheet = _places(stations)
    for points, where in ((ground, "on the ground"), (sheet, "on the sheet")):
        if len(points) == 0 or float(np.abs(points - points[0]).max()) < _SAME_PLACE:
            raise EditionError(
                f"The drift cannot be measured: no two stations have different places {where}. "
                "Draw at least two stations, and check their coordinates."
            )
    shift = _Shift(ground, sheet, north_up_fit(ground, sheet))
    field = AffineField(ground, sheet)
    moved = _stations(stations, shift, field)
    changed = links_drift(links, *(ends_of(stations, links, at) for at in (ground, sheet)))
    return DriftReport(
        north_up=shift.fit,
        free=free_fit(ground, sheet),
        diagonal_m=shift.diagonal_m,
        stations=moved,
        links=changed,
        summary=summary_of(moved, changed, ground, sheet, settings),
        warp=warp_of(field, shift.scale),
        settings=settings,
        typical_link_mm=float(np.median([k.drawn_length_mm for k in changed])) if changed else 0.0,
    )


def _places(stations: Sequence[PlacedStation]) -> tuple[Plane, Plane]:
    """Give true places in local metres and drawn ones in millimetres, both y up."""
    ground = local_metres([(station.lon, station.lat) for station in stations])
    sheet = np.array([complex(s.x_mm, -s.y_mm) for s in stations], dtype=np.complex128)
    return ground, sheet


@dataclass(frozen=True, slots=True)
class _Shift:
    """True and drawn places, y up, and the fit that lays one on the other."""

    ground: Plane
    sheet: Plane
    fit: Fit

    @property
    def scale(self) -> float:
        """Sheet units per metre; without any north-up likeness the drawing's own size counts."""
        scale = self.fit.scale_mm_per_km / 1000.0
        if scale > 0.0:
            return scale
        z, w = centred(self.ground), centred(self.sheet)
        return float(np.sqrt(np.sum(np.abs(w) ** 2) / np.sum(np.abs(z) ** 2)))

    @property
    def diagonal_m(self) -> float:
        """Diagonal of the bounding box on the ground, metres."""
        return math.hypot(float(np.ptp(self.ground.real)), float(np.ptp(self.ground.imag)))


def _stations(
    stations: Sequence[PlacedStation], shift: _Shift, field: AffineField
) -> tuple[StationDrift, ...]:
    """Measure each station's displacement w / s − z, both centred, and the map round it."""
    z, w = centred(shift.ground), centred(shift.sheet)
    moved = w / shift.scale - z
    true_mm = shift.sheet.mean() + shift.scale * z
    size, turn = local_scales(field)
    return tuple(
        StationDrift(
            station_id=station.id,
            name=station.name,
            displacement_m=float(abs(moved[i])),
            direction_deg=math.degrees(math.atan2(moved[i].real, moved[i].imag)) % 360.0,
            displacement_share=float(abs(moved[i])) / shift.diagonal_m,
            drawn_mm=(station.x_mm, station.y_mm),
            true_mm=(float(true_mm[i].real), float(-true_mm[i].imag)),
            local_scale=float(size[i]),
            local_rotation_deg=float(turn[i]),
        )
        for i, station in enumerate(stations)
    )
