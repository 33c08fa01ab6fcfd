"""Faults of a finished scene, found by reading it again; shares no code with its making."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Collection, Iterator, Mapping

from gtfs_schematic.drawing.model import Drawing, Group, PathShape, TextShape
from gtfs_schematic.network.model import Network

_NUMBERS = re.compile(r"-?\d+(?:\.\d+)?")
_CAUTION_WORDS = (
    "not to scale", "navigation", "operation", "works", "evacuation", "step-free", "verified",
    "publications",
)  # fmt: skip
_OUTSIDE_MM = 0.01


def faults(
    drawing: Drawing,
    network: Network,
    *,
    unnamed: Collection[str] = (),
    said_as: Mapping[str, str] | None = None,
) -> tuple[str, ...]:
    """List what is wrong with a drawing; empty when all is well.

    1. Every line and every station of the network is drawn exactly once, with a title.
    2. Every station's name stands beside its marker, but for the ids in `unnamed`; those in
       `said_as` stand in the short form given there.
    3. Everything lies on the page.
    4. The cautions, the publisher and the feed's attributions stand on the sheet.
    """
    groups = [group for top in drawing.groups for group in _groups(top)]
    return (
        *_counts(groups, "line", [line.id for line in network.lines]),
        *_counts(groups, "station", [station.id for station in network.stations]),
        *_names(groups, network, unnamed, said_as or {}),
        *_outside(drawing, groups),
        *_words(groups, network),
    )


def _groups(group: Group) -> Iterator[Group]:
    yield group
    for child in group.children:
        if isinstance(child, Group):
            yield from _groups(child)


def _counts(groups: list[Group], kind: str, wanted: list[str]) -> Iterator[str]:
    found = [group for group in groups if group.css_class == kind]
    counts = Counter(group.data.get(kind, "") for group in found)
    for id_ in wanted:
        if counts[id_] != 1:
            yield f"{kind} {id_!r} is drawn {counts[id_]} times instead of once"
    for id_ in sorted(counts.keys() - set(wanted)):
        yield f"{kind} {id_!r} is drawn but not in the network"
    for group in found:
        id_ = group.data.get(kind, "")
        if not group.title:
            yield f"{kind} {id_!r} has no title"
        if not any(isinstance(child, PathShape) for child in group.children):
            yield f"{kind} {id_!r} has no path"


def _names(
    groups: list[Group],
    network: Network,
    unnamed: Collection[str],
    said_as: Mapping[str, str],
) -> Iterator[str]:
    said = {
        group.data["station"]: " ".join(
            child.text
            for child in group.children
            if isinstance(child, TextShape) and child.css_class == "station-name"
        )
        for group in groups
        if group.css_class == "station" and "station" in group.data
    }
    for station in network.stations:
        wanted = "" if station.id in unnamed else said_as.get(station.id, station.name)
        if _letters(said.get(station.id, "")) != _letters(wanted):
            yield (
                f"station {station.id!r} is named {said.get(station.id, '')!r} "
                f"instead of {wanted!r}"
            )


def _letters(text: str) -> str:
    """Drop blanks and line-end hyphens' company: a name may be broken over lines."""
    return re.sub(r"\s+", "", text)


def _outside(drawing: Drawing, groups: list[Group]) -> Iterator[str]:
    for group in groups:
        for child in group.children:
            if isinstance(child, Group):
                continue
            corners = _path_points(child) if isinstance(child, PathShape) else _text_box(child)
            if any(
                not (-_OUTSIDE_MM <= x <= drawing.width_mm + _OUTSIDE_MM)
                or not (-_OUTSIDE_MM <= y <= drawing.height_mm + _OUTSIDE_MM)
                for x, y in corners
            ):
                what = repr(child.text) if isinstance(child, TextShape) else "a path"
                where = " ".join(group.data.values())
                yield f"{what} of {group.css_class} {where!r} leaves the page"


def _path_points(shape: PathShape) -> list[tuple[float, float]]:
    values = [float(word) for word in _NUMBERS.findall(shape.d)]
    return list(zip(values[::2], values[1::2], strict=True))


def _text_box(shape: TextShape) -> list[tuple[float, float]]:
    """Give the corners of a run of text: an em high above the baseline, turned by complex numbers.

    A turn by the angle w about c is z ↦ c + (z − c) e^(iw), clockwise on a sheet with y down.
    """
    pivot = complex(*shape.pivot)
    turn = complex(1.0, 0.0)
    if shape.angle_deg:
        turn = (complex(0.0, 1.0)) ** (shape.angle_deg / 90.0)
    corners = []
    for x in (shape.x, shape.x + shape.width):
        for y in (shape.y - 0.75 * shape.size, shape.y + 0.22 * shape.size):
            place = pivot + (complex(x, y) - pivot) * turn
            corners.append((place.real, place.imag))
    return corners


def _words(groups: list[Group], network: Network) -> Iterator[str]:
    texts = [c.text for g in groups for c in g.children if isinstance(c, TextShape)]
    said = " ".join(texts)
    lower = said.casefold()
    for word in _CAUTION_WORDS:
        if word not in lower:
            yield f"the cautions on the sheet do not mention {word!r}"
    dense = _letters(said)
    for kind, wanted in (
        *(("attribution", text) for text in network.info.attributions),
        ("publisher", network.info.publisher),
        ("service date", network.info.service_date),
    ):
        if _letters(wanted) not in dense:
            yield f"the {kind} {wanted!r} is not on the sheet"
