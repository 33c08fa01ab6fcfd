"""A name is broken into rows: at spaces, after hyphens and slashes, before brackets."""

from __future__ import annotations

import itertools
from functools import lru_cache

from gtfs_schematic.labels.fonts import text_width_mm

_BREAK_AFTER = frozenset("-/\N{HYPHEN}\N{EN DASH}\N{EM DASH}")
_BRACKETS = frozenset("([{")
_SHORT_WORD = 3
_SHORT_WORD_COST = 0.25
_HYPHEN_COST = 0.12
_MOST_PLACES = 14


@lru_cache(maxsize=65536)
def break_name(name: str, rows: int) -> tuple[str, ...] | None:
    """Break a name into rows of even width.

    The best break has the narrowest widest row; breaks that a reader stumbles over cost part of
    the name's width: behind a short word (which belongs to the next) and behind a hyphen or
    slash. A bracket is a welcome place, and no row is left with three characters or fewer.
    Common practice, no source.

    Parameters
    ----------
    name
        The name; no-break spaces are kept.
    rows
        How many rows, at least 1.

    Returns
    -------
    The rows from top to bottom, or None if the name cannot be broken so.
    """
    pieces = _pieces(" ".join(name.split(" ")))
    if rows > len(pieces):
        return None
    whole = text_width_mm(name, 1.0) or 1.0
    best: tuple[float, tuple[str, ...]] | None = None
    for cuts in itertools.combinations(range(1, len(pieces)), rows - 1):
        bounds = (0, *cuts, len(pieces))
        broken = tuple("".join(pieces[a:b]).strip(" ") for a, b in itertools.pairwise(bounds))
        if rows > 1 and min(map(len, broken)) <= _SHORT_WORD:
            continue
        cost = max(text_width_mm(row, 1.0) for row in broken) / whole
        cost += sum(_cut_cost(above, below) for above, below in itertools.pairwise(broken))
        if best is None or cost < best[0] - 1e-9:
            best = (cost, broken)
    return best[1] if best else None


def most_rows(name: str) -> int:
    """Give into how many rows a name can be broken at most."""
    return len(_pieces(name))


def _cut_cost(above: str, below: str) -> float:
    """Give the cost of a break between two rows as a share of the name's width."""
    if below[0] in _BRACKETS:
        return -0.1
    if above[-1] in _BREAK_AFTER:
        return _HYPHEN_COST
    last = above.rsplit(" ", maxsplit=1)[-1]
    return _SHORT_WORD_COST if len(last) <= _SHORT_WORD and last.islower() else 0.0


def _pieces(name: str) -> list[str]:
    """Split a name at every place where a row may end; joined, the pieces are the name again."""
    pieces = [""]
    for i, character in enumerate(name):
        before = name[i - 1] if i else ""
        follows_break = before == " " or (before in _BREAK_AFTER and i > 1)
        opens = character in _BRACKETS and before not in _BRACKETS
        may_start = character != " " and character not in _BREAK_AFTER
        if i and may_start and (follows_break or opens) and pieces[-1].strip(" "):
            pieces.append("")
        pieces[-1] += character
    while len(pieces) > _MOST_PLACES:  # a very long name: pair up the shortest neighbours
        widths = [len(a) + len(b) for a, b in itertools.pairwise(pieces)]
        i = widths.index(min(widths))
        pieces[i : i + 2] = [pieces[i] + pieces[i + 1]]
    return pieces
