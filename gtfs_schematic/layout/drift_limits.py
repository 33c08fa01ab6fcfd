"""How far stations may be drawn from their true places: rows of the programme, and who collides.

Drift is the distance between where a station is drawn and where the best north-up similarity has
it: that of least squares, w ≈ s z + t with z and w centred, s = Re Σ z̄w / Σ|z|². Scale and shift
are linear in the drawing, and so is every station's drift.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.layout.columns import Columns
from gtfs_schematic.layout.model import LayoutSettings
from gtfs_schematic.layout.plane import PlaneGraph
from gtfs_schematic.layout.rows import Rows

_SIDES = 16
"""Corners of the polygon within the circle that holds a station: its sides are 2 % nearer."""
_USUAL_MM = 8.0
"""Station spacing of a usual diagram on the sheet."""
_AT_LIMIT = 4000.0
_DEAREST = 100_000.0
"""Price of standing at the limit, and the most that a square spacing may cost."""
_MARGIN_MM = 0.1
"""Kept free for rounding to hundredths of a millimetre."""
_MISSED_MM = 0.01
_NORMALS = np.array(
    [
        (math.cos(math.tau * (k + 0.5) / _SIDES), math.sin(math.tau * (k + 0.5) / _SIDES))
        for k in range(_SIDES)
    ]
)
_INNER = math.cos(math.pi / _SIDES)


@dataclass(frozen=True)
class DriftLimits:
    """Limits by vertex; both kinds hold where both are set."""

    stations: NDArray[np.int64]
    """Vertices that are stations, by which the drawing is fitted to the ground, shape (n,)."""
    ground_km: NDArray[np.float64]
    """Their true places about their mean, y north as the sheet has it, kilometres, shape (n, 2)."""
    limit_m: NDArray[np.float64]
    """Per station in metres on the ground; infinite for none."""
    limit_mm: NDArray[np.float64]
    """Per station in millimetres on the sheet; infinite for none."""
    loose: frozenset[int] | None = None
    """Stations, by number in `stations`, whose limits only draw them, but strongly; None while
    nobody asks whose limits collide."""

    def missed_mm(self, points: NDArray[np.float64]) -> NDArray[np.float64]:
        """Give by how much each station misses its limits in a drawing, millimetres."""
        scale, away = fitted(self.ground_km, points[self.stations])
        most = np.minimum(self.limit_m / 1000.0 * scale, self.limit_mm)
        return np.asarray((away @ _NORMALS.T).max(axis=1) + _MARGIN_MM - _INNER * most)

    def said(self, found: tuple[int, ...], names: tuple[str | None, ...], pins: str) -> str:
        """Say that the limits of some stations collide, by their numbers in `stations`."""
        those = ", ".join(self._written(i, names) for i in found)
        return (
            f"{'This drift limit' if len(found) == 1 else 'Together these drift limits'} cannot be "
            "kept with every line in the directions of the diagram, all distances kept"
            f"{pins}: {those}. If one of them were higher the others could hold. Raise one, raise "
            "the fidelity, allow a larger sheet, or draw fewer lines."
        )

    def _written(self, i: int, names: tuple[str | None, ...]) -> str:
        """Name a station with its limits."""
        limits = [
            f"{limit:g} {unit}"
            for limit, unit in ((self.limit_m[i], "m"), (self.limit_mm[i], "mm"))
            if math.isfinite(limit)
        ]
        return f"{names[self.stations[i]]} ({', '.join(limits)})"


def fitted(
    ground: NDArray[np.float64], places: NDArray[np.float64]
) -> tuple[float, NDArray[np.float64]]:
    """Give the scale of the best fit without rotation, and what is left of each place.

    Both of shape (n, 2) and with y up; `ground` has its mean at the origin.
    """
    w = places - places.mean(axis=0)
    scale = max(0.0, float((ground * w).sum() / max(float((ground * ground).sum()), 1e-12)))
    return scale, w - scale * ground


def are_limited(settings: LayoutSettings) -> bool:
    """Whether any station's drift is limited."""
    return bool(settings.drift_limit_m or settings.drift_limit_mm or settings.drift_limits_m)


def limits_of(graph: PlaneGraph, settings: LayoutSettings) -> DriftLimits | None:
    """Give the limits of a graph all stations of which are vertices; None if there are none."""
    if not are_limited(settings):
        return None
    stations = np.array(
        [v for v, s in enumerate(graph.station_of) if s and s not in graph.junctions]
    )
    names = [graph.station_of[v] or "" for v in stations]
    ground = graph.points[stations] / 1000.0
    metres = [settings.drift_limits_m.get(name, settings.drift_limit_m) for name in names]
    return DriftLimits(
        stations,
        ground - ground.mean(axis=0),
        np.array([limit or math.inf for limit in metres]),
        np.full(len(names), settings.drift_limit_mm or math.inf),
    )


def anchors_keep(
    graph: PlaneGraph, anchors: NDArray[np.float64], settings: LayoutSettings, share: float
) -> bool:
    """Whether anchors, in station spacings, are within a share of all limits."""
    names = {v: s for v, s in enumerate(graph.station_of) if s and s not in graph.junctions}
    for piece in graph.pieces:
        names.update(zip(piece.nodes[1:-1], piece.stations, strict=True))
    points = np.array(sorted(names))
    ground = graph.points[points] - graph.points[points].mean(axis=0)
    scale, away = fitted(ground, anchors[points])
    most = [_in_spacings(settings, names[int(v)], 1.0 / max(scale, 1e-12)) for v in points]
    return bool((np.hypot(away[:, 0], away[:, 1]) <= share * np.array(most)).all())


def anchor_price(graph: PlaneGraph, settings: LayoutSettings, usual: int) -> int:
    """Give the price of a square spacing from an anchor under which limits are likely to hold."""
    if not are_limited(settings) or not len(graph.segments):
        return usual
    a, b = graph.segments.T
    lengths = np.hypot(*(graph.points[a] - graph.points[b]).T) / graph.segment_shares
    spacing_m = float(np.median(lengths))
    least = min(_in_spacings(settings, s, spacing_m) for s in ("", *settings.drift_limits_m))
    return round(min(max(usual, _AT_LIMIT / max(least, 1e-3) ** 2), _DEAREST))


def _in_spacings(settings: LayoutSettings, station: str, spacing_m: float) -> float:
    """Give a station's limit in spacings; millimetres by a usual size, as there is no sheet."""
    metres = settings.drift_limits_m.get(station, settings.drift_limit_m) or math.inf
    return min(metres / spacing_m, (settings.drift_limit_mm or math.inf) / _USUAL_MM)


def hold_drift(equal: Rows, most: Rows, columns: Columns, limits: DriftLimits) -> None:
    """Add the rows that fit the drawing to the ground and hold every station to its limits."""
    count = len(limits.stations)
    scale, *middle = columns.fit
    axes = (columns.x[limits.stations], columns.y[limits.stations])
    for axis, shift in zip(axes, middle, strict=True):
        _sum(equal, axis, np.ones(count), int(shift), float(count))
    square = float((limits.ground_km**2).sum())
    _sum(equal, np.concatenate(axes), limits.ground_km.T.ravel(), int(scale), square)
    for limit, to_scale in ((limits.limit_m / 1000.0, True), (limits.limit_mm, False)):
        held = np.flatnonzero(np.isfinite(limit))
        for normal in _NORMALS if len(held) else ():
            ahead = limits.ground_km[held] @ normal
            reach = limit[held] * _INNER
            terms = [
                (axes[0][held], np.full(len(held), normal[0])),
                (axes[1][held], np.full(len(held), normal[1])),
                (np.full(len(held), middle[0]), np.full(len(held), -normal[0])),
                (np.full(len(held), middle[1]), np.full(len(held), -normal[1])),
                (np.full(len(held), scale), -ahead - (reach if to_scale else 0.0)),
                (columns.excess[held], np.full(len(held), -1.0)),
            ]
            most.add(terms, (0.0 if to_scale else reach) - _MARGIN_MM)


def _sum(
    equal: Rows, columns: NDArray[np.int64], values: NDArray[np.float64], whole: int, factor: float
) -> None:
    """Add one row: Σ value · x[column] = factor · x[whole]."""
    equal.add_one(np.append(columns, whole), np.append(values, -factor))


def colliding(
    limits: DriftLimits, solve: Callable[[DriftLimits], NDArray[np.float64] | None]
) -> tuple[int, ...]:
    """Find stations whose limits cannot all be kept, none of which can be left out.

    Parameters
    ----------
    limits
        All limits.
    solve
        Solves with some limits loose; None if there is no solution.

    Notes
    -----
    Elastic filter, then deletion filter (Chinneck and Dravnieks 1991, "Locating minimal
    infeasible constraint sets in linear programs"): what an elastic programme misses becomes
    hard, until there is no solution; then each that is not needed for that goes.
    """
    everyone = frozenset(range(len(limits.stations)))
    hard: frozenset[int] = frozenset()
    while True:
        points = solve(replace(limits, loose=everyone - hard))
        if points is None:
            break
        missed = np.flatnonzero(limits.missed_mm(points) > _MISSED_MM).tolist()
        fresh = frozenset(missed) - hard
        if not fresh:
            break
        hard |= fresh
    for i in sorted(hard):
        if solve(replace(limits, loose=everyone - (hard - {i}))) is None:
            hard -= {i}
    return tuple(sorted(hard))
