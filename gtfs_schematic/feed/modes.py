"""Route types of GTFS, base and extended, folded into a few modes."""

from __future__ import annotations

from types import MappingProxyType

MODES = (
    "aerial",
    "bus",
    "cable",
    "ferry",
    "funicular",
    "metro",
    "monorail",
    "other",
    "rail",
    "tram",
    "trolleybus",
)
"""All values of `Route.mode`."""

REPLACEMENT = "replacement"
"""Word that may stand among the wanted modes: services that stand in for closed lines."""

REPLACEMENT_TYPES = frozenset({110, 714})

_BASE = MappingProxyType(
    {
        0: "tram",
        1: "metro",
        2: "rail",
        3: "bus",
        4: "ferry",
        5: "cable",
        6: "aerial",
        7: "funicular",
        11: "trolleybus",
        12: "monorail",
    }
)
"""GTFS Schedule reference, routes.txt, route_type."""

_SINGLE = MappingProxyType({405: "monorail", 907: "cable", 1701: "cable"})
"""Extended types that differ from their hundred (from memory, but for 405)."""

_HUNDREDS = MappingProxyType(
    {
        1: "rail",
        2: "bus",
        3: "rail",
        4: "metro",
        5: "metro",
        6: "metro",
        7: "bus",
        8: "trolleybus",
        9: "tram",
        10: "ferry",
        11: "other",
        12: "ferry",
        13: "aerial",
        14: "funicular",
        15: "other",
        17: "other",
    }
)
"""Extended types by their hundred; 100, 200, 400 and 700 as in the published proposal for
extended route types, the others from memory of the European list of modes it is taken from."""


def mode_of(route_type: int) -> str | None:
    """Give the mode of a base or extended route type; None if the type is unknown."""
    if route_type in _BASE:
        return _BASE[route_type]
    if route_type in _SINGLE:
        return _SINGLE[route_type]
    return _HUNDREDS.get(route_type // 100)


def refusal(route_type: int, mode: str, wanted: tuple[str, ...]) -> str | None:
    """Say why a route is left out by the wanted modes; None if it is kept.

    Parameters
    ----------
    wanted
        Modes to keep; empty keeps all. Replacement services are kept only if `REPLACEMENT` is
        among them, whatever their own mode: they follow the lines they stand in for.
    """
    if route_type in REPLACEMENT_TYPES:
        return None if REPLACEMENT in wanted else "replacement service, a mode to be asked for"
    if wanted and mode not in wanted:
        return f"mode {mode} is not among those asked for"
    return None
