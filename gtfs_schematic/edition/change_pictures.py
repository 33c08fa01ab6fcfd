"""Pictures of a change sheet: clippings of both diagrams, and both drawn over each other."""

from __future__ import annotations

import itertools
import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from html import escape

from gtfs_schematic.edition.model import Edition
from gtfs_schematic.geometry import Point

_AROUND_MM = 24.0
"""What of the surroundings a clipping shows on each side, millimetres of the sheet."""
_LEAST_MM = 60.0
OLD, NEW = "#B35900", "#0B5CAD"
_ROOT = re.compile(rb"<svg\b([^>]*)>(.*)</svg>", re.DOTALL)
_IDS = re.compile(r"""\s(?:id|aria-labelledby|role|xmlns|width|height|viewBox)="[^"]*\"""")

Box = tuple[float, float, float, float]
"""Left, top, width and height on the sheet, millimetres."""


@dataclass(frozen=True, slots=True)
class Sheets:
    """An edition before and after, each with its diagram as SVG."""

    before: Edition
    before_svg: bytes
    after: Edition
    after_svg: bytes
    before_pdf: bytes = b""
    """The same as PDF, for print; empty: not known."""
    after_pdf: bytes = b""


def definitions(sheets: Sheets) -> str:
    """Give both diagrams once, to be shown in part as often as wanted."""
    parts = (("before", sheets.before_svg), ("after", sheets.after_svg))
    groups = "".join(_group(name, svg) for name, svg in parts)
    return f'<svg width="0" height="0" class="store" aria-hidden="true"><defs>{groups}</defs></svg>'


def _group(name: str, svg: bytes) -> str:
    """Make an SVG file a group; ids would stand twice in the page, so they go."""
    found = _ROOT.search(svg)
    if found is None:
        return f'<g id="{name}"></g>'
    attributes, content = (part.decode("utf-8") for part in found.groups())
    content = re.sub(r"(<(?:title|desc)) id=\"[^\"]*\"", r"\1", content)
    return f'<g id="{name}"{_IDS.sub("", attributes)}>{content}</g>'


def clippings(sheets: Sheets, places: Sequence[str]) -> str:
    """Show the surroundings of stations before and after, side by side, at one scale."""
    box = box_of(sheets, places)
    if box is None:
        return ""
    cells = []
    for name, caption, edition in (
        ("before", "Before", sheets.before),
        ("after", "After", sheets.after),
    ):
        rings = _rings(edition, set(places), box[2])
        cells.append(
            f'<figure><figcaption>{caption}</figcaption><svg viewBox="{_view(box)}" role="img" '
            f'aria-label="{caption}: part of {escape(edition.title)}"><use href="#{name}"/>{rings}'
            "</svg></figure>"
        )
    return f'<div class="pair">{"".join(cells)}</div>'


def box_of(sheets: Sheets, places: Sequence[str]) -> Box | None:
    """Give what of the sheet to show: all places on both diagrams, and something round them."""
    wanted = set(places)
    points = [
        (s.x_mm, s.y_mm)
        for edition in (sheets.before, sheets.after)
        for s in edition.stations
        if s.id in wanted
    ]
    if not points:
        return None
    xs, ys = zip(*points, strict=True)
    both = (sheets.before, sheets.after)
    spans = []
    for low, high, most in (
        (min(xs), max(xs), min(edition.width_mm for edition in both)),
        (min(ys), max(ys), min(edition.height_mm for edition in both)),
    ):
        length = max(high - low + 2.0 * _AROUND_MM, _LEAST_MM)
        middle = (low + high - length) / 2.0
        # At the sheet's edge there is nothing beyond to show.
        spans.append((max(min(middle, most - length), 0.0), length))
    (left, width), (top, height) = spans
    return left, top, width, height


def _rings(edition: Edition, wanted: set[str], width: float) -> str:
    """Ring stations, as wide and strong as suits a clipping of that width."""
    radius = max(2.8, 0.022 * width)
    circles = "".join(
        f'<circle cx="{s.x_mm:g}" cy="{s.y_mm:g}" r="{radius:.3g}"/>'
        for s in edition.stations
        if s.id in wanted
    )
    return f'<g class="ring" stroke-width="{0.005 * width:.2g}">{circles}</g>'


def overlay(sheets: Sheets) -> str:
    """Draw the links and stations of both over each other: what differs stands out in color."""
    before, after = sheets.before, sheets.after
    width = max(before.width_mm, after.width_mm)
    height = max(before.height_mm, after.height_mm)
    old, new = links_of_edition(before), links_of_edition(after)
    both = [path for path in old if path in new]
    layers = (
        ("#9AA0A6", both),
        (OLD, [path for path in old if path not in new]),
        (NEW, [path for path in new if path not in old]),
    )
    drawn = "".join(
        f'<g fill="none" stroke="{color}" stroke-width="1.2">{"".join(map(_path, paths))}</g>'
        for color, paths in layers
    )
    return (
        f'<svg class="overlay" viewBox="{_view((0.0, 0.0, width, height))}" role="img" '
        'aria-label="Both editions over each other">'
        f"{drawn}{''.join(_stations(before, after))}</svg>"
        f'<p><span style="color:{OLD}">■</span> only before '
        f'<span style="color:{NEW}">■</span> only after '
        '<span style="color:#9AA0A6">■</span> in both, at the same place. Lines from ring to ring '
        "join the places of one station.</p>"
    )


def links_of_edition(edition: Edition) -> dict[tuple[Point, ...], None]:
    """Give the paths of all links, each in the direction that sorts first; sorted."""
    return dict.fromkeys(sorted(min(k.path_mm, k.path_mm[::-1]) for k in edition.links))


def _stations(before: Edition, after: Edition) -> Iterator[str]:
    old = {s.id: (s.x_mm, s.y_mm) for s in before.stations}
    new = {s.id: (s.x_mm, s.y_mm) for s in after.stations}
    for key in sorted(set(old) | set(new)):
        a, b = old.get(key), new.get(key)
        if a == b and a is not None:
            yield _dot(a, "#9AA0A6", 0.9)
            continue
        if a is not None:
            yield _dot(a, OLD, 1.6)
        if b is not None:
            yield _dot(b, NEW, 1.6)
        if a is not None and b is not None:
            yield (
                f'<line x1="{a[0]:g}" y1="{a[1]:g}" x2="{b[0]:g}" y2="{b[1]:g}" stroke="{NEW}" '
                'stroke-width="0.5" stroke-dasharray="1 1"/>'
            )


def _dot(at: Point, color: str, radius: float) -> str:
    return (
        f'<circle cx="{at[0]:g}" cy="{at[1]:g}" r="{radius:g}" fill="#fff" stroke="{color}" '
        'stroke-width="0.6"/>'
    )


def _path(points: tuple[Point, ...]) -> str:
    return f'<polyline points="{" ".join(f"{x:g},{y:g}" for x, y in points)}"/>'


def _view(box: Box) -> str:
    return " ".join(f"{value:.6g}" for value in box)


def grouped(places: Mapping[str, Sequence[str]], most: int) -> list[tuple[list[str], list[str]]]:
    """Gather things whose stations overlap, so that each place is shown once.

    Parameters
    ----------
    places
        Per thing its stations.
    most
        Things with more stations than this are told in words alone: they are everywhere.

    Returns
    -------
    list
        (things, stations) of each picture, in the order of the first thing.
    """
    groups: list[tuple[list[str], list[str]]] = []
    for thing, stations in places.items():
        if not stations or len(stations) > most:
            continue
        hit = [group for group in groups if set(group[1]) & set(stations)]
        fits = next((g for g in hit if len(set(g[1]) | set(stations)) <= most), None)
        if fits is None:
            groups.append(([thing], list(dict.fromkeys(stations))))
        else:
            fits[0].append(thing)
            fits[1].extend(s for s in dict.fromkeys(stations) if s not in fits[1])
    return [(list(dict.fromkeys(itertools.chain(things))), stations) for things, stations in groups]
