"""How far the search for a name's place goes: the usual places, and two widenings."""

from __future__ import annotations

from dataclasses import dataclass, replace


@dataclass(frozen=True, slots=True)
class Reach:
    """How far the search for places goes."""

    gap_mm: float = 0.3
    """Least distance of a label from its own marker beyond the clearance."""
    push_mm: float = 2.5
    """How far a label may be pushed from its marker."""
    step_mm: float = 0.25
    """Steps in which it is pushed."""
    further_mm: tuple[float, ...] = ()
    """Distances beyond the first free place that are tried too."""
    rows: int = 3
    slides: tuple[float, ...] = (0.0, -0.25, 0.25)
    """Shifts along the marker's side, in widths or in rows."""
    scales: tuple[float, ...] = (1.0,)
    """Type sizes in sizes of the settings."""
    drop_badges: bool = False
    around_mm: float = 0.0
    """How far from the marker any place at all is tried."""
    kept: int = 6
    """Free places kept per station, side and angle: the cheapest."""


NEAR = Reach(further_mm=(0.5,))
"""The usual places."""
FAR = Reach(
    gap_mm=0.05,
    push_mm=4.0,
    step_mm=0.15,
    further_mm=(0.75, 1.5),
    rows=4,
    slides=(0.0, -0.25, 0.25, -0.4, 0.4),
    scales=(1.0, 0.9),
    drop_badges=True,
    kept=12,
)
"""For labels in the way of one that finds no place."""
ANYWHERE = replace(FAR, step_mm=0.1, around_mm=14.0, kept=30)
"""For a label that finds no place."""
