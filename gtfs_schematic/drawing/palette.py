"""Colours by which lines can be told apart, where the feed's own do not do that."""

from __future__ import annotations

import hashlib
import itertools
import math
from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace

import numpy as np

from gtfs_schematic.drawing.contrast import (
    GRAPHIC_MINIMUM,
    TEXT_MINIMUM,
    contrast_ratio,
    mix,
    relative_luminance,
)
from gtfs_schematic.drawing.difference import VISIONS, Floats, differences, seen
from gtfs_schematic.drawing.model import DrawingSettings
from gtfs_schematic.feed.model import Finding
from gtfs_schematic.network.model import Line, Network

SIMILAR = 10.0
"""Colours that differ by less (CIEDE2000) are taken for one in a thin line (our choice: 10 to 15
are common practice, no source)."""
SIMILAR_SIMULATED = 5.0
"""The same for colours as a person sees them who lacks one kind of cone."""
_SIMULATED_WEIGHT = 2.0
_STEP = 0x22
_CHROMA = (28.0, 88.0)
"""Between grey and garish, in CIELAB."""
_LEAST_LIGHTNESS = 28.0
"""Darker ones pass for black, CIELAB."""
_SHELVES = (4, 8)
"""Palettes hold 4 colours, or a multiple of 8: a line more rarely changes those of the others."""


def recolored(network: Network, settings: DrawingSettings) -> Network:
    """Give the network with colours by which its lines can be told apart, and findings that say so.

    1. A colour that more than half of the lines share tells nothing: each gets one of its own.
    2. Of two different colours that look alike the one with fewer trips is replaced, on all lines
       that have it. Lines of the very same colour are the operator's family and stay one.
    3. With ``colors = "distinct"`` every line has a colour of its own, also as simulated for
       colour-vision deficiency as far as that goes; with "feed" 1 and 2 are left out.
    4. On dark paper, colours that would not show (WCAG 2.2, 1.4.11) are mixed with the ink.
    5. Names of lines that cannot be read on them become black or white (WCAG 2.2, 1.4.3).
    """
    wanted = {} if settings.colors == "feed" else _replaced(network, settings)
    findings = list(_told(network, wanted))
    lines = []
    for line in network.lines:
        color = _showing(wanted.get(line.id, line.color), settings)
        ratio = contrast_ratio(line.text_color, color)
        text = line.text_color if ratio >= TEXT_MINIMUM else _readable_on(color)
        if text != line.text_color and color == line.color:
            message = (
                f"the name of line {line.name} has contrast {math.floor(100 * ratio) / 100:.2f}:1 "
                f"on {color}, 4.5:1 is wanted; {text} was chosen"
            )
            findings.append(Finding("info", "routes.txt", message, field="route_text_color"))
        own = line.color_from_feed and color == line.color
        lines.append(replace(line, color=color, text_color=text, color_from_feed=own))
    findings += _alike_in_simulation(lines)
    return replace(network, lines=tuple(lines), findings=(*network.findings, *findings))


def _showing(color: str, settings: DrawingSettings) -> str:
    """Give a colour with as much ink as makes it show on dark paper.

    On light paper a pale line keeps its colour, which riders know, and gets an edge instead.
    """
    if relative_luminance(settings.background) > relative_luminance(settings.ink):
        return color
    lighter = (mix(color, settings.ink, twentieths / 20.0) for twentieths in range(20))
    return next(
        (c for c in lighter if contrast_ratio(c, settings.background) >= GRAPHIC_MINIMUM), color
    )


def _replaced(network: Network, settings: DrawingSettings) -> dict[str, str]:
    """Give the new colour of every line that needs one."""
    families = _families(network, settings)
    trips = {key: sum(line.trips for line in lines) for key, lines in families.items()}
    shared = Counter(line.color for line in network.lines)
    kept: list[str] = []
    lost: list[str] = []
    for key in sorted(families, key=lambda key: (-trips[key], key)):
        color = families[key][0].color
        common = 2 * shared[color] > len(network.lines) > 1
        strict = settings.colors == "distinct"
        if common or _looks_like_one_of(color, kept, strict=strict):
            lost.append(key)
        else:
            kept.append(color)
    given = _given(sorted(lost), (*kept, settings.ink), settings.background)
    return {line.id: given[key] for key in lost for line in families[key]}


def _families(network: Network, settings: DrawingSettings) -> Mapping[str, list[Line]]:
    """Give the lines that keep one colour together, by the least of their ids."""
    shared = Counter(line.color for line in network.lines)
    families: dict[str, list[Line]] = {}
    first: dict[str, str] = {}
    for line in sorted(network.lines, key=lambda line: line.id):
        common = 2 * shared[line.color] > len(network.lines)
        alone = settings.colors == "distinct" or common
        key = line.id if alone else first.setdefault(line.color, line.id)
        families.setdefault(key, []).append(line)
    return families


def _looks_like_one_of(color: str, others: Sequence[str], *, strict: bool) -> bool:
    if not others:
        return False
    labs = seen([color, *others])
    apart = differences(labs[:, :1], labs[:, 1:]).min(axis=1)
    return bool(apart[0] < SIMILAR or (strict and apart[1:].min() < SIMILAR_SIMULATED))


def _given(keys: Sequence[str], kept: Sequence[str], background: str) -> dict[str, str]:
    """Give each key a colour; which one follows from the key, so that it mostly keeps it."""
    if not keys:
        return {}
    shelf = _SHELVES[0] if len(keys) <= _SHELVES[0] else _SHELVES[1]
    free = list(_palette(shelf * math.ceil(len(keys) / shelf), kept, background))
    given = {}
    for key in keys:
        given[key] = min(free, key=lambda color: _digest(key, color))
        free.remove(given[key])
    return given


def _digest(key: str, color: str) -> bytes:
    return hashlib.sha256(f"{key}\n{color}".encode()).digest()


def _palette(size: int, kept: Sequence[str], background: str) -> tuple[str, ...]:
    """Give colours each as far as can be from the kept ones and from those before it.

    The farthest first (Gonzalez 1985, "Clustering to minimize the maximum intercluster distance",
    Theoretical Computer Science 38). Where the candidates are too few they come again.
    """
    candidates = _candidates(background)
    labs = seen(candidates)
    nearest = np.full(len(candidates), np.inf)
    for color in kept:
        nearest = np.minimum(nearest, _apart(labs, seen([color])))
    chosen: list[int] = []
    while len(chosen) < size:
        if chosen and len(chosen) % len(candidates) == 0:
            nearest = np.full(len(candidates), np.inf)
        i = int(np.argmax(np.round(nearest, 6)))
        chosen.append(i)
        nearest = np.minimum(nearest, _apart(labs, labs[:, i : i + 1]))
        nearest[i] = -1.0
    return tuple(candidates[i] for i in chosen)


def _apart(labs: Floats, other: Floats) -> Floats:
    """Give by how much colours differ from one, to the eye that tells them apart least."""
    by_vision = differences(labs, other)
    result: Floats = np.minimum(by_vision[0], _SIMULATED_WEIGHT * by_vision[1:].min(axis=0))
    return result


def _candidates(background: str) -> list[str]:
    """Give the colours to choose from: neither grey nor garish, and they show on the paper."""
    steps = range(0, 256, _STEP)
    grid = [f"#{r:02X}{g:02X}{b:02X}" for r, g, b in itertools.product(steps, steps, steps)]
    lab = seen(grid)[0]
    chroma = np.hypot(lab[:, 1], lab[:, 2])
    return [
        color
        for color, light, value in zip(grid, lab[:, 0].tolist(), chroma.tolist(), strict=True)
        if light >= _LEAST_LIGHTNESS
        and _CHROMA[0] <= value <= _CHROMA[1]
        and contrast_ratio(color, background) >= GRAPHIC_MINIMUM
    ]


def _readable_on(color: str) -> str:
    """Give black or white, whichever reads better; it has at least 4.58:1 on any colour."""
    return max(("#000000", "#FFFFFF"), key=lambda text: contrast_ratio(color, text))


def _told(network: Network, wanted: Mapping[str, str]) -> Iterator[Finding]:
    """Say which colours were replaced: one by one, or where many lines share one, together."""
    shared = Counter(line.color for line in network.lines if line.id in wanted)
    said: set[str] = set()
    for line in network.lines:
        if line.id not in wanted or line.color in said:
            continue
        if shared[line.color] > 3:
            said.add(line.color)
            message = f"{shared[line.color]} lines share this colour; each was given its own"
        else:
            message = (
                f"the colour of line {line.name} is too much like another's; "
                f"{wanted[line.id]} was chosen"
            )
        yield Finding("info", "routes.txt", message, field="route_color", value=line.color)


def _alike_in_simulation(lines: Sequence[Line]) -> Iterator[Finding]:
    """Name the pairs of colours that a person who lacks one kind of cone may take for one."""
    first: dict[str, Line] = {}
    for line in lines:
        first.setdefault(line.color, line)
    if len(first) < 2:
        return
    labs = seen(list(first))
    by_vision = differences(labs[:, :, None], labs[:, None])
    for (i, one), (j, other) in itertools.combinations(enumerate(first.values()), 2):
        worst = int(np.argmin(by_vision[1:, i, j])) + 1
        if by_vision[worst, i, j] < SIMILAR_SIMULATED:
            message = (
                f"lines {one.name} and {other.name} may look alike to a person with "
                f"{VISIONS[worst]}opia (CIEDE2000 {by_vision[worst, i, j]:.1f}); their names tell "
                "them apart"
            )
            yield Finding("info", "routes.txt", message, field="route_color")
