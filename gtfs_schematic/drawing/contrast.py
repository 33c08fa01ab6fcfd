"""Contrast of the feed's colours, by the formula of WCAG 2.2."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from gtfs_schematic.network.model import Network

GRAPHIC_MINIMUM = 3.0
"""WCAG 2.2, success criterion 1.4.11: parts of a graphic that are needed to understand it."""
TEXT_MINIMUM = 4.5
"""WCAG 2.2, success criterion 1.4.3: text that is not large."""


@dataclass(frozen=True, slots=True)
class ContrastFinding:
    """A line whose colours are too close, and by how much."""

    line_id: str
    line_name: str
    part: Literal["line", "text"]
    """The line on the sheet's background, or its name on the line's own colour."""
    foreground: str
    background: str
    ratio: float
    minimum: float

    @property
    def message(self) -> str:
        """Say it to a person; the ratio is cut, never rounded up."""
        cut = int(self.ratio * 100.0) / 100.0
        what = "is drawn" if self.part == "line" else "has its name"
        return (
            f"Line {self.line_name!r} {what} in {self.foreground} on {self.background}: "
            f"contrast {cut:.2f}:1, below {self.minimum:g}:1."
        )


def relative_luminance(color: str) -> float:
    """Give the relative luminance of "#RRGGBB", 0 for black to 1 for white (WCAG 2.2, glossary)."""
    red, green, blue = (_linear(int(color[i : i + 2], 16) / 255.0) for i in (1, 3, 5))
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


def contrast_ratio(first: str, second: str) -> float:
    """Give the contrast ratio of two colours "#RRGGBB", 1 to 21 (WCAG 2.2, glossary)."""
    dark, light = sorted((relative_luminance(first), relative_luminance(second)))
    return (light + 0.05) / (dark + 0.05)


def mix(color: str, other: str, share: float) -> str:
    """Give `color` with `share` (0 to 1) of `other` mixed in, channel by channel, as "#RRGGBB"."""
    channels = (
        round(int(color[i : i + 2], 16) * (1.0 - share) + int(other[i : i + 2], 16) * share)
        for i in (1, 3, 5)
    )
    return "#" + "".join(f"{channel:02X}" for channel in channels)


def contrast_findings(network: Network, background: str) -> tuple[ContrastFinding, ...]:
    """List the lines that are hard to see on `background`, and names hard to read on their line."""
    findings = []
    for line in network.lines:
        on_sheet = contrast_ratio(line.color, background)
        if on_sheet < GRAPHIC_MINIMUM:
            findings.append(
                ContrastFinding(
                    line.id, line.name, "line", line.color, background, on_sheet, GRAPHIC_MINIMUM
                )
            )
        on_line = contrast_ratio(line.text_color, line.color)
        if on_line < TEXT_MINIMUM:
            findings.append(
                ContrastFinding(
                    line.id, line.name, "text", line.text_color, line.color, on_line, TEXT_MINIMUM
                )
            )
    return tuple(findings)


def _linear(channel: float) -> float:
    """Undo the sRGB transfer curve for one channel from 0 to 1."""
    if channel <= 0.04045:
        return channel / 12.92
    return float(((channel + 0.055) / 1.055) ** 2.4)
