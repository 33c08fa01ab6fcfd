"""Weigh what speaks for and against two stations, or two lines, being one.

Each field adds the logarithm of how much likelier its agreement is among true pairs than among
others (Fellegi & Sunter 1969, "A Theory for Record Linkage"). The steps below are common practice,
no source; what ids are worth is learned from the two feeds themselves, since some keep theirs and
others give all of them anew, or to other things.
"""

from __future__ import annotations

import math
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from difflib import SequenceMatcher
from functools import lru_cache

import numpy as np

from gtfs_schematic.network.naming import loose_key, name_key

PRIOR = -3.0
"""Most pairs that come into question are not one."""
_NAME = ((0.4, 0.7, 0.85, 1.0), (-3.5, 0.0, 2.0, 4.0))
_PLACE = ((0.0, 0.05, 0.2, 0.5, 1.0, 2.0, 5.0, 20.0), (5.0, 4.5, 3.0, 1.0, -0.5, -2.5, -6.0, -12.0))
"""By distance in typical spacings of stations."""
_AROUND = (-1.5, 4.5)
_LINES = (-1.0, 2.5)
_COURSE = ((0.0, 0.2, 0.5, 0.8, 0.9, 1.0), (-4.0, -2.0, 1.0, 3.5, 4.5, 5.5))
_LOOSE = 0.9
_PART = 0.8


@dataclass(frozen=True, slots=True)
class Worth:
    """What it says if ids agree, and if they do not; never below, and never above, nought."""

    agree: float
    differ: float


@dataclass(frozen=True, slots=True)
class Weight:
    """What one field says: its logarithm, and the words for a person; empty if not worth a word."""

    value: float
    words: str = ""


def worth_of(shared_right: int, shared: int, right_shared: int, right: int, most: float) -> Worth:
    """Learn what ids are worth.

    Parameters
    ----------
    shared_right, shared
        Of pairs with an id in common, how many agree in name or place.
    right_shared, right
        Of pairs that agree in name and place, how many have an id in common.
    most
        The most that agreement may count.
    """
    hit = (shared_right + 0.5) / (shared + 1.0)
    # A few pairs prove little: two count as if they had kept nothing.
    kept = right_shared / (right + 2.0)
    return Worth(
        min(most, max(0.0, math.log(hit / (1.0 - hit)) + 1.0)) if hit > 0.5 else 0.0,
        max(-2.0, math.log(1.0 - kept)) if kept > 0.5 else 0.0,
    )


def ids_weight(one: Collection[str], other: Collection[str], worth: Worth, noun: str) -> Weight:
    """Say what two lists of ids say."""
    if not one or not other:
        return Weight(0.0)
    common = set(one) & set(other)
    if not common:
        return Weight(worth.differ, f"other {noun}" if worth.differ < -0.5 else "")
    whole = common == set(one) == set(other)
    words = f"the same {noun}" if whole else f"{noun} in common"
    return Weight(worth.agree, words if worth.agree > 0.0 else "")


def name_weight(one: str, other: str, holders: int) -> Weight:
    """Say what two names say; a name that many have says less."""
    alike = likeness(one, other)
    value = float(np.interp(alike, *_NAME))
    if value > 0.0:
        value = max(0.5, value - math.log(max(1, holders)))
    if alike == 1.0:
        return Weight(value, "the same name")
    return Weight(value, f"a similar name ({alike:.0%})" if alike >= 0.7 else "another name")


@lru_cache(maxsize=100_000)
def likeness(one: str, other: str) -> float:
    """Give how alike two names are, 0 … 1; the same either way round."""
    a, b = sorted((name_key(one), name_key(other)))
    if a == b:
        return 1.0
    words = [frozenset(key.split()) for key in (a, b)]
    if loose_key(one) == loose_key(other) != "":
        return _LOOSE
    common = len(words[0] & words[1])
    if common and common == min(map(len, words)):
        return _PART
    # SequenceMatcher is not the same both ways round; sorting makes it so.
    return min(0.99, SequenceMatcher(None, a, b, autojunk=False).ratio())


def place_weight(meters: float, spacing_m: float) -> Weight:
    """Say what the distance between two stations says."""
    value = float(np.interp(meters / spacing_m, *_PLACE))
    return Weight(value, f"{meters:.0f} m apart" if meters >= 1.0 else "the same place")


def around_weight(one: Collection[str], other: Collection[str], known: Mapping[str, str]) -> Weight:
    """Say what the neighbours say, by the old and the new ones, and new ids by old."""
    mapped = {known[key] for key in one if key in known}
    if not mapped and not set(known.values()) & set(other):
        return Weight(0.0)
    share = _dice(len(mapped & set(other)), len(one), len(other))
    base, rise = _AROUND
    return Weight(base + rise * share, f"{share:.0%} of the neighbors" if share else "")


def lines_weight(one: Collection[str], other: Collection[str], known: Mapping[str, str]) -> Weight:
    """Say what the calling lines say, likewise."""
    if not known:
        return Weight(0.0)
    mapped = {known[key] for key in one if key in known}
    share = _dice(len(mapped & set(other)), len(one), len(other))
    base, rise = _LINES
    return Weight(
        base + rise * share, f"{share:.0%} of the lines" if share else "no line in common"
    )


def course_weight(one: Collection[str], other: Collection[str], known: Mapping[str, str]) -> Weight:
    """Say what the stations of two lines say."""
    mapped = {known[key] for key in one if key in known}
    share = _dice(len(mapped & set(other)), len(one), len(other))
    return Weight(float(np.interp(share, *_COURSE)), f"{share:.0%} of the stations")


def line_name_weight(one: str, other: str, holders: int) -> Weight:
    """Say what two lines' short names say: likeness of "5" and "6" says nothing."""
    a, b = name_key(one), name_key(other)
    if a == b:
        return Weight(max(0.5, 4.0 - math.log(max(1, holders))), "the same name")
    if set(a.split()) & set(b.split()):
        return Weight(1.0, "a name in part the same")
    return Weight(-2.5, "another name")


def surety(weights: Sequence[Weight]) -> float:
    """Give the logarithm of the odds that the pair is one."""
    return PRIOR + sum(weight.value for weight in weights)


def words_of(weights: Sequence[Weight]) -> str:
    """Give the reason for a person."""
    return ", ".join(weight.words for weight in weights if weight.words)


def _dice(common: int, one: int, other: int) -> float:
    return 2.0 * common / (one + other) if one + other else 0.0
