"""Paths as SVG writes them, made of M, L, C and Z only, so that every export reads them alike."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

from gtfs_schematic.bundles.model import Corner
from gtfs_schematic.geometry import Point, distance, unit_vector

_QUARTER = 4.0 / 3.0 * math.tan(math.pi / 8.0)
"""Handle length of the cubic that stands for a quarter of the unit circle; off by 0.03 % at most:
4/3 tan(angle / 4) for an arc of any angle, e.g. Riskus 2006, "Approximation of a cubic Bezier
curve by circular arcs and vice versa"."""
_STRAIGHT_RAD = 1e-6

Command = tuple[str, tuple[float, ...]]


def number(value: float) -> str:
    """Write a number with at most three decimals, no trailing zeros and no negative zero."""
    text = f"{value:.3f}".rstrip("0").rstrip(".")
    return "0" if text in ("-0", "") else text


def polyline(points: Sequence[Point], *, closed: bool = False) -> str:
    """Give the path through points, sheet millimetres; `closed` joins the last to the first."""
    pieces = [("M" if i == 0 else "L") + _pair(point) for i, point in enumerate(points)]
    return "".join(pieces) + ("Z" if closed else "")


def rounded(corners: Sequence[Corner]) -> str:
    """Give the path through corners, each rounded by an arc of its radius.

    Where two arcs would need more than the segment between them, both shrink in proportion.
    """
    points = [corner.at_mm for corner in corners]
    turns = [_turn(points, i) for i in range(len(points))]
    tangents = [
        corner.radius_mm * math.tan(min(turn, 3.0) / 2.0)
        for corner, turn in zip(corners, turns, strict=True)
    ]
    shares = [1.0] * len(points)
    for i in range(len(points) - 1):
        needed, given = tangents[i] + tangents[i + 1], distance(points[i], points[i + 1])
        if needed > given:
            shares[i] = min(shares[i], given / needed)
            shares[i + 1] = min(shares[i + 1], given / needed)
    pieces = ["M" + _pair(points[0])]
    for i in range(1, len(points) - 1):
        tangent = tangents[i] * shares[i]
        if tangent <= 0.0 or turns[i] < _STRAIGHT_RAD:
            pieces.append("L" + _pair(points[i]))
            continue
        # Handle 4/3 tan(turn / 4) r, with r = tangent / tan(turn / 2).
        handle = 4.0 / 3.0 * math.tan(turns[i] / 4.0) * tangent / math.tan(turns[i] / 2.0)
        into, out = unit_vector(points[i], points[i - 1]), unit_vector(points[i], points[i + 1])
        start, end = _along(points[i], into, tangent), _along(points[i], out, tangent)
        pieces += [
            "L" + _pair(start),
            "C" + _pair(_along(points[i], into, tangent - handle)),
            " " + _pair(_along(points[i], out, tangent - handle)),
            " " + _pair(end),
        ]
    pieces.append("L" + _pair(points[-1]))
    return "".join(pieces)


def circle(center: Point, radius: float) -> str:
    """Give a closed circle."""
    x, y = center
    return rounded_rectangle((x - radius, y - radius, x + radius, y + radius), radius)


def rounded_rectangle(box: tuple[float, float, float, float], radius: float) -> str:
    """Give a closed rectangle (left, top, right, bottom) with corners of `radius`."""
    left, top, right, bottom = box
    r = min(radius, (right - left) / 2.0, (bottom - top) / 2.0)
    if r <= 0.0:
        return polyline([(left, top), (right, top), (right, bottom), (left, bottom)], closed=True)
    k = r * (1.0 - _QUARTER)
    pieces = ["M" + _pair((left + r, top))]
    for line_to, first, second, end in (
        ((right - r, top), (right - k, top), (right, top + k), (right, top + r)),
        ((right, bottom - r), (right, bottom - k), (right - k, bottom), (right - r, bottom)),
        ((left + r, bottom), (left + k, bottom), (left, bottom - k), (left, bottom - r)),
        ((left, top + r), (left, top + k), (left + k, top), (left + r, top)),
    ):
        pieces += ["L" + _pair(line_to), "C" + _pair(first), " " + _pair(second), " " + _pair(end)]
    return "".join(pieces) + "Z"


def commands(d: str) -> Iterator[Command]:
    """Read a path that this module wrote, command by command, with absolute coordinates."""
    letter, digits = "", ""
    for character in d + "Z":
        if character in "MLCZ":
            if letter:
                yield letter, tuple(float(word) for word in digits.replace(",", " ").split())
            letter, digits = character, ""
        else:
            digits += character


def _pair(point: Point) -> str:
    return f"{number(point[0])},{number(point[1])}"


def _along(start: Point, direction: Point, length: float) -> Point:
    return (start[0] + direction[0] * length, start[1] + direction[1] * length)


def _turn(points: Sequence[Point], i: int) -> float:
    """Give by how much the path turns at a point, radians from 0 to pi; 0 at the ends."""
    if i in (0, len(points) - 1):
        return 0.0
    into, out = unit_vector(points[i - 1], points[i]), unit_vector(points[i], points[i + 1])
    cross, dot = into[0] * out[1] - into[1] * out[0], into[0] * out[0] + into[1] * out[1]
    return abs(math.atan2(cross, dot))


def turned(d: str, angle_deg: float, pivot: Point) -> str:
    """Give a path of this module turned clockwise about a point."""
    if angle_deg == 0.0:
        return d
    cos, sin = math.cos(math.radians(angle_deg)), math.sin(math.radians(angle_deg))
    pieces = []
    for letter, values in commands(d):
        pairs = []
        for x, y in zip(values[::2], values[1::2], strict=True):
            dx, dy = x - pivot[0], y - pivot[1]
            pairs.append(_pair((pivot[0] + dx * cos - dy * sin, pivot[1] + dx * sin + dy * cos)))
        pieces.append(letter + " ".join(pairs))
    return "".join(pieces)
