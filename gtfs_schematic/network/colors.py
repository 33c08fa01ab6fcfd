"""Colors of lines: contrast as WCAG 2.2 counts it, and distinct ones where a feed has none."""

from __future__ import annotations

import hashlib
import math
from collections.abc import Iterable, Mapping
from functools import cache

_PALE = 230
"""A color of which every channel (0 … 255) is at least this is as good as white."""
_READABLE = 3.0
"""Least contrast of large text and of graphics that matter (WCAG 2.2, 1.4.3 and 1.4.11)."""
_HUES = 24
_SHADES = ((0.44, 0.10), (0.52, 0.14), (0.58, 0.13))
"""Lightness and chroma (Oklch) of the colors to choose from, dark, strong and lighter."""
_APART = (0.16, 0.12, 0.09, 0.06, 0.03)
"""Distances in Oklab that a new color should keep from all others, best first."""


def luminance(color: str) -> float:
    """Give the relative luminance of "#RRGGBB", 0 … 1 (WCAG 2.2, relative luminance)."""
    r, g, b = (_linear(channel / 255.0) for channel in _channels(color))
    return 0.2126 * r + 0.7152 * g + 0.0722 * b


def contrast(one: str, other: str) -> float:
    """Give the contrast ratio of two colors, 1 … 21 (WCAG 2.2, contrast ratio)."""
    dark, light = sorted((luminance(one), luminance(other)))
    return (light + 0.05) / (dark + 0.05)


def is_usable(color: str | None) -> bool:
    """Tell whether a line can be drawn in this color on white paper at all.

    An empty color means white in GTFS; white and near-white lines would vanish. A bright yellow
    is hard to see too, but it is the operator's choice.
    """
    return color is not None and min(_channels(color)) < _PALE


def text_color_on(color: str, wanted: str | None) -> str:
    """Give the wanted text color if it can be read on `color`, else black or white.

    Of the two the one with more contrast is taken; it has at least 4.58:1 on any color.
    """
    if wanted is not None and contrast(color, wanted) >= _READABLE:
        return wanted
    return max(("#000000", "#FFFFFF"), key=lambda text: contrast(color, text))


def generated_colors(line_ids: Iterable[str], taken: Iterable[str]) -> Mapping[str, str]:
    """Give each line a color of its own, distinct from the taken ones and from each other.

    Every color has a contrast of at least 3:1 on white. A line tries the candidates in an order
    that depends on its id alone, so that it mostly keeps its color when others come and go.
    """
    used = [_oklab(color) for color in sorted(set(taken))]
    given: dict[str, str] = {}
    for line_id in sorted(line_ids):
        ranked = sorted(_candidates(), key=lambda c: _digest(line_id, c))
        gaps = {
            color: min((math.dist(_oklab(color), u) for u in used), default=1.0) for color in ranked
        }
        limit = next((d for d in _APART if max(gaps.values()) >= d), 0.0)
        given[line_id] = next(color for color in ranked if gaps[color] >= limit)
        used.append(_oklab(given[line_id]))
    return given


@cache
def _candidates() -> tuple[str, ...]:
    colors = []
    for lightness, chroma in _SHADES:
        for k in range(_HUES):
            angle = 2.0 * math.pi * k / _HUES
            lab = (lightness, chroma * math.cos(angle), chroma * math.sin(angle))
            color = _from_oklab(lab)
            if contrast(color, "#FFFFFF") >= _READABLE:
                colors.append(color)
    return tuple(sorted(set(colors)))


def _digest(line_id: str, color: str) -> bytes:
    return hashlib.sha256(f"{line_id}\n{color}".encode()).digest()


def _channels(color: str) -> tuple[int, int, int]:
    return (int(color[1:3], 16), int(color[3:5], 16), int(color[5:7], 16))


def _linear(c: float) -> float:
    return c / 12.92 if c <= 0.04045 else float(((c + 0.055) / 1.055) ** 2.4)


@cache
def _oklab(color: str) -> tuple[float, float, float]:
    """Convert to Oklab (Björn Ottosson 2020, "A perceptual color space for image processing")."""
    r, g, b = (_linear(channel / 255.0) for channel in _channels(color))
    long = math.cbrt(0.4122214708 * r + 0.5363325363 * g + 0.0514459929 * b)
    medium = math.cbrt(0.2119034982 * r + 0.6806995451 * g + 0.1073969566 * b)
    short = math.cbrt(0.0883024619 * r + 0.2817188376 * g + 0.6299787005 * b)
    return (
        0.2104542553 * long + 0.7936177850 * medium - 0.0040720468 * short,
        1.9779984951 * long - 2.4285922050 * medium + 0.4505937099 * short,
        0.0259040371 * long + 0.7827717662 * medium - 0.8086757660 * short,
    )


def _from_oklab(lab: tuple[float, float, float]) -> str:
    """Undo `_oklab`; what lies outside of sRGB is clipped channel by channel."""
    lightness, a, b = lab
    long = (lightness + 0.3963377774 * a + 0.2158037573 * b) ** 3
    medium = (lightness - 0.1055613458 * a - 0.0638541728 * b) ** 3
    short = (lightness - 0.0894841775 * a - 1.2914855480 * b) ** 3
    linear = (
        4.0767416621 * long - 3.3077115913 * medium + 0.2309699292 * short,
        -1.2684380046 * long + 2.6097574011 * medium - 0.3413193965 * short,
        -0.0041960863 * long - 0.7034186147 * medium + 1.7076147010 * short,
    )
    return "#" + "".join(f"{round(255.0 * _encoded(c)):02X}" for c in linear)


def _encoded(c: float) -> float:
    c = min(1.0, max(0.0, c))
    return 12.92 * c if c <= 0.0031308 else 1.055 * c ** (1.0 / 2.4) - 0.055
