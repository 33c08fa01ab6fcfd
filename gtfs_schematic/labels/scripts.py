"""A text is cut into runs of one script and direction, in the order in which they are seen.

A short form of the bidirectional algorithm (Unicode Standard Annex 9) for names, which are one
line without nested quotations: the first letter that has a direction gives the whole its own, signs
between letters of one direction go with them, and digits run from the left in either.
"""

from __future__ import annotations

import itertools
import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import uharfbuzz as hb

_NEUTRAL_SCRIPTS = frozenset({None, "Zyyy", "Zinh", "Zzzz"})
_RIGHT_TO_LEFT = frozenset({"R", "AL"})
_DIGITS = frozenset({"EN", "AN"})


@dataclass(frozen=True, slots=True)
class Run:
    """A part of a text with one script and direction; `start` is an index into the text."""

    start: int
    text: str
    rtl: bool


def is_rtl(text: str) -> bool:
    """Tell whether a text as a whole is read from the right: as its first letter is."""
    for character in text:
        way = unicodedata.bidirectional(character)
        if way in _RIGHT_TO_LEFT or way == "L":
            return way != "L"
    return False


def runs_of(text: str) -> tuple[Run, ...]:
    """Give the runs of a text from left to right."""
    ways = _directions(text)
    scripts = _scripts(text)
    pieces: list[Run] = []
    start = 0
    for (rtl, _), members in itertools.groupby(zip(ways, scripts, strict=True)):
        length = len(list(members))
        pieces.append(Run(start, text[start : start + length], rtl))
        start += length
    whole = is_rtl(text)
    # Pieces in the direction of the whole follow it; the others keep their own order inside.
    groups = [list(members) for _, members in itertools.groupby(pieces, key=lambda run: run.rtl)]
    ordered = [group[::-1] if group[0].rtl else group for group in groups]
    if whole:
        ordered.reverse()
    return tuple(run for group in ordered for run in group)


def _directions(text: str) -> Sequence[bool]:
    """Tell of every character whether it runs from the right."""
    whole = is_rtl(text)
    sides = _sides(text, whole=whole)
    found: list[bool] = []
    for i, character in enumerate(text):
        if unicodedata.bidirectional(character) in _DIGITS:
            found.append(False)
            continue
        side = sides[i]
        if side is None:
            before = next((side for side in reversed(sides[:i]) if side is not None), whole)
            after = next((side for side in sides[i:] if side is not None), whole)
            side = before if before == after else whole
        found.append(side)
    return found


def _sides(text: str, *, whole: bool) -> Sequence[bool | None]:
    """Tell of every character to which side it draws the signs beside it; None for signs.

    Digits count with the letters before them (rules W2, W7 and N1 of the annex).
    """
    sides: list[bool | None] = []
    strong = whole
    for character in text:
        way = unicodedata.bidirectional(character)
        if way in _RIGHT_TO_LEFT or way == "L":
            strong = way != "L"
            sides.append(strong)
        elif way in _DIGITS:
            sides.append(strong)
        elif way == "NSM" and sides:
            sides.append(sides[-1])
        else:
            sides.append(None)
    return sides


def _scripts(text: str) -> Sequence[str | None]:
    """Give the script of every character; neutral ones join the run before."""
    found: list[str | None] = []
    current: str | None = next((s for s in map(script_of, text) if s is not None), None)
    for character in text:
        current = script_of(character) or current
        found.append(current)
    return found


@lru_cache(maxsize=4096)
def script_of(character: str) -> str | None:
    """Give the script of a character as the shaper knows it, None if it serves any script."""
    buffer = hb.Buffer()
    buffer.add_str(character)
    buffer.guess_segment_properties()
    return None if buffer.script in _NEUTRAL_SCRIPTS else buffer.script
