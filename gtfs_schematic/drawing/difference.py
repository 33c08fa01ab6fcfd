"""How different two colours look: CIEDE2000, also to eyes that lack one kind of cone."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

_TO_XYZ = np.array(
    [
        [0.4124, 0.3576, 0.1805],
        [0.2126, 0.7152, 0.0722],
        [0.0193, 0.1192, 0.9505],
    ]
)
"""Linear sRGB to XYZ under D65 (IEC 61966-2-1)."""
_SIMULATED = np.array(
    [
        np.eye(3),
        [
            [0.152286, 1.052583, -0.204868],
            [0.114503, 0.786281, 0.099216],
            [-0.003882, -0.048116, 1.051998],
        ],
        [
            [0.367322, 0.860646, -0.227968],
            [0.280085, 0.672501, 0.047413],
            [-0.011820, 0.042940, 0.968881],
        ],
        [
            [1.255528, -0.076749, -0.178779],
            [-0.078411, 0.930809, 0.147602],
            [0.004733, 0.691367, 0.303900],
        ],
    ]
)
"""Of linear sRGB at full severity (Machado, Oliveira and Fernandes 2009, "A physiologically-based
model for simulation of color vision deficiency", IEEE TVCG 15(6); their table); the first sees
everything."""
VISIONS = ("full", "protan", "deutan", "tritan")
"""Ways of seeing, in the order of the first axis of what `seen` gives."""


def seen(colors: Sequence[str]) -> Floats:
    """Give CIELAB values of colours "#RRGGBB" for each way of seeing, shape (4, N, 3).

    Simulated colours are clipped to what a screen can show.
    """
    channels = np.array([[int(c[i : i + 2], 16) / 255.0 for i in (1, 3, 5)] for c in colors])
    linear = np.where(channels <= 0.04045, channels / 12.92, ((channels + 0.055) / 1.055) ** 2.4)
    simulated = np.clip(np.einsum("vij,nj->vni", _SIMULATED, linear.reshape(-1, 3)), 0.0, 1.0)
    return _lab(simulated)


def differences(labs: Floats, others: Floats) -> Floats:
    """Give CIEDE2000 between CIELAB values; the last axis holds L*, a*, b*, the others broadcast.

    Sharma, Wu and Dalal 2005, "The CIEDE2000 color-difference formula: implementation notes,
    supplementary test data, and mathematical observations", Color Research and Application 30(1);
    all weights 1. About 1 is the least that shows side by side.
    """
    light_1, chroma_1, hue_1, light_2, chroma_2, hue_2 = _cylinder(labs, others)
    product = chroma_1 * chroma_2
    turn = np.where(product == 0.0, 0.0, (hue_2 - hue_1 + 180.0) % 360.0 - 180.0)
    # Opposite hues: the notes take +180, where the remainder above gives -180.
    turn = np.where((turn == -180.0) & (hue_2 > hue_1), 180.0, turn)
    d_hue = 2.0 * np.sqrt(product) * np.sin(np.radians(turn) / 2.0)
    light, chroma = (light_1 + light_2) / 2.0, (chroma_1 + chroma_2) / 2.0
    total = hue_1 + hue_2
    apart = np.abs(hue_1 - hue_2) > 180.0
    mean = np.where(apart, (total + np.where(total < 360.0, 360.0, -360.0)) / 2.0, total / 2.0)
    hue = np.where(product == 0.0, total, mean)
    weight = (
        1.0
        - 0.17 * _cos(hue - 30.0)
        + 0.24 * _cos(2.0 * hue)
        + 0.32 * _cos(3.0 * hue + 6.0)
        - 0.20 * _cos(4.0 * hue - 63.0)
    )
    s_light = 1.0 + 0.015 * (light - 50.0) ** 2 / np.sqrt(20.0 + (light - 50.0) ** 2)
    part_light = (light_2 - light_1) / s_light
    part_chroma = (chroma_2 - chroma_1) / (1.0 + 0.045 * chroma)
    part_hue = d_hue / (1.0 + 0.015 * chroma * weight)
    rotation = (
        -2.0 * _seventh(chroma) * np.sin(np.radians(60.0 * np.exp(-(((hue - 275.0) / 25.0) ** 2))))
    )
    square = part_light**2 + part_chroma**2 + part_hue**2 + rotation * part_chroma * part_hue
    result: Floats = np.sqrt(np.maximum(square, 0.0))
    return result


def _cylinder(labs: Floats, others: Floats) -> tuple[Floats, ...]:
    """Give lightness, adjusted chroma and hue (degrees) of both sides."""
    light_1, a_1, b_1 = np.moveaxis(labs, -1, 0)
    light_2, a_2, b_2 = np.moveaxis(others, -1, 0)
    mean = (np.hypot(a_1, b_1) + np.hypot(a_2, b_2)) / 2.0
    stretch = 1.0 + 0.5 * (1.0 - _seventh(mean))
    red_1, red_2 = a_1 * stretch, a_2 * stretch
    hue_1 = np.degrees(np.arctan2(b_1, red_1)) % 360.0
    hue_2 = np.degrees(np.arctan2(b_2, red_2)) % 360.0
    return light_1, np.hypot(red_1, b_1), hue_1, light_2, np.hypot(red_2, b_2), hue_2


def _seventh(chroma: Floats) -> Floats:
    power = chroma**7
    result: Floats = np.sqrt(power / (power + 25.0**7))
    return result


def _cos(degrees: Floats) -> Floats:
    result: Floats = np.cos(np.radians(degrees))
    return result


def _lab(linear: Floats) -> Floats:
    """Convert linear sRGB, last axis, to CIELAB under D65 (CIE 15)."""
    share = linear @ _TO_XYZ.T / _TO_XYZ.sum(axis=1)
    f = np.where(
        share > (6.0 / 29.0) ** 3, np.cbrt(share), share / (3.0 * (6.0 / 29.0) ** 2) + 4.0 / 29.0
    )
    x, y, z = np.moveaxis(f, -1, 0)
    result: Floats = np.stack([116.0 * y - 16.0, 500.0 * (x - y), 200.0 * (y - z)], axis=-1)
    return result
