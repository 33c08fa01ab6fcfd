"""A shape's word: the pieces of the network that it crosses, in order and with the side.

Two curves with the same word can be turned into each other without passing over a station, where
every face has one outline and no island in it: words decide homotopy in a plane with holes (e.g.
Cabello, Liu, Mantler and Snoeyink 2004, "Testing homotopy for paths in the plane"; from memory).
Crossing a piece and coming right back, with no station between, cancels where it is too short to
show; where it is long it stays: a ferry, or a line through the corner of a park, is to be seen
there.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.background.planes import Piece

Floats = NDArray[np.float64]

SHORT_MM = 8.0
"""Less of a line between two crossings is not shown."""


@dataclass(frozen=True, slots=True)
class Crossed:
    """One letter of a word."""

    piece: int
    """Number of the piece, negative if it is crossed from its left to its right."""
    share: float
    """How far along the piece, 0 … 1."""
    along: float
    """Where on the curve: index of its segment and share of that."""


def word_of(curve: Floats, pieces: Sequence[Piece], *, closed: bool) -> tuple[Crossed, ...]:
    """Give the reduced word of a curve on the ground.

    Parameters
    ----------
    curve
        Metres, y north, shape (n, 2); a closed one repeats its first point.
    pieces
        Those of the network and its bridges.
    closed
        Whether the curve is a ring, so that its ends may cancel too.
    """
    letters = list(_reduced(_crossings(curve, pieces), pieces))
    while closed and len(letters) > 1 and _cancels(letters[-1], letters[0], pieces):
        letters = letters[1:-1]
    return tuple(letters)


def _crossings(curve: Floats, pieces: Sequence[Piece]) -> list[Crossed]:
    """Give all crossings in the order of the curve."""
    segments = np.stack([curve[:-1], curve[1:]], axis=1)
    courses = np.array([piece.ground for piece in pieces])
    tree = shapely.STRtree(shapely.linestrings(segments))
    owner, k = tree.query(shapely.linestrings(courses), predicate="intersects")
    a, v = segments[k, 0], segments[k, 1] - segments[k, 0]
    p, u = courses[owner, 0], courses[owner, 1] - courses[owner, 0]
    turn = u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0]
    real = np.flatnonzero(turn)
    w = a - p
    found = []
    for i in real:
        share = (w[i, 0] * v[i, 1] - w[i, 1] * v[i, 0]) / turn[i]
        t = (w[i, 0] * u[i, 1] - w[i, 1] * u[i, 0]) / turn[i]
        # A curve that touches with a corner crosses with one of its two segments only.
        if 0.0 <= t < 1.0 and 0.0 <= share <= 1.0:
            number = int(np.sign(turn[i])) * (int(owner[i]) + 1)
            found.append(Crossed(number, float(share), float(k[i] + t)))
    return sorted(found, key=lambda each: (each.along, abs(each.piece)))


def _reduced(letters: Sequence[Crossed], pieces: Sequence[Piece]) -> list[Crossed]:
    kept: list[Crossed] = []
    for letter in letters:
        if kept and _cancels(kept[-1], letter, pieces):
            kept.pop()
        else:
            kept.append(letter)
    return kept


def _cancels(one: Crossed, next_: Crossed, pieces: Sequence[Piece]) -> bool:
    """Tell whether a crossing takes back the one before it, with next to nothing between."""
    if one.piece != -next_.piece:
        return False
    line = pieces[abs(one.piece) - 1].sheet
    length = float(np.hypot(*np.diff(line, axis=0).T).sum())
    return abs(one.share - next_.share) * length < SHORT_MM
