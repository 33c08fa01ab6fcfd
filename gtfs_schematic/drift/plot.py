"""Plots for reports: the network colored by displacement, as SVG and as PNG."""

from __future__ import annotations

import re
from html import escape

from gtfs_schematic.drift.figure import written
from gtfs_schematic.drift.figures import FIGURE
from gtfs_schematic.drift.model import DriftReport
from gtfs_schematic.drift.picture import SHARE_EDGES, picture
from gtfs_schematic.drift.placed import Diagram
from gtfs_schematic.errors import SchematicError

_HUES = ("#b9d7d9", "#79b4bd", "#3f8ba3", "#2b5f8c", "#1f2f66")
_HEAD, _FOOT, _WIDTH = 84.0, 74.0, 1000.0
_TOLD = ("displacement-p95", "bearing-over-45", "octant-agreement", "planning-error-over-1.15")
_FONT = "font-family:Noto Sans,DejaVu Sans,sans-serif"


def to_svg(report: DriftReport, diagram: Diagram, *, title: str) -> bytes:
    """Draw the network as in the page, with arrows, grid, key and the foremost figures.

    Parameters
    ----------
    report
        What was measured.
    diagram
        Of what.
    title
        Title of the diagram.
    """
    net, _ = picture(report, diagram, label=title)
    head = re.match(r'<svg[^>]*viewBox="0 0 ([\d.]+) ([\d.]+)"[^>]*--r:([\d.]+)"[^>]*>', net)
    if head is None:
        raise ValueError("the picture has no size")
    width, height, radius = (float(value) for value in head.groups())
    whole = _HEAD + height + _FOOT
    inner = net[head.end() : -len("</svg>")]
    told = " · ".join(
        f"{FIGURE[name].label}: {written(FIGURE[name], FIGURE[name].read(report))}"
        for name in _TOLD
        if FIGURE[name].read(report) is not None
    )
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" width="{_WIDTH:g}" height="{whole:g}" '
        f'viewBox="0 0 {_WIDTH:g} {whole:g}" role="img"><title>{escape(title)}</title>'
        f"<style>{_style(radius)}</style>"
        f'<rect width="{_WIDTH:g}" height="{whole:g}" fill="#ffffff"/>'
        f'<text class="head" x="14" y="36">Drift of {escape(title)}</text>'
        f'<text class="told" x="14" y="62">{escape(told)}</text>'
        f'<g transform="translate({(_WIDTH - width) / 2.0:g} {_HEAD:g})">{inner}</g>'
        f"{_key(_HEAD + height + 14.0)}</svg>\n"
    ).encode()


def to_png(svg: bytes, *, width: int = 2000) -> bytes:
    """Give a plot as an image so many pixels wide; texts in the system's fonts.

    Raises
    ------
    SchematicError
        If the system has no cairo library.
    """
    try:
        import cairosvg  # noqa: PLC0415 - importing it fails where the library is missing
    except OSError as error:
        raise SchematicError(
            "The PNG plot needs the system library cairo, which was not found: install it "
            "(Debian and Ubuntu: apt install libcairo2) and run again."
        ) from error
    return bytes(cairosvg.svg2png(bytestring=svg, output_width=width))


def _style(radius: float) -> str:
    hues = "".join(
        f".courses .d{i}{{stroke:{hue}}}.stations .d{i}{{fill:{hue}}}"
        for i, hue in enumerate(_HUES)
    )
    return (
        f"path{{fill:none;stroke-linejoin:round;stroke-linecap:round}}text{{{_FONT};fill:#1b1f24}}"
        ".head{font-size:24px;font-weight:bold}.told{font-size:11.5px}.entry{font-size:14px}"
        ".grid path{stroke:#cdd3da;stroke-width:.9}"
        f".courses path{{stroke-width:{0.95 * radius:.2f}px}}"
        ".courses .walk{stroke:#7b8490;stroke-width:1.6px;stroke-dasharray:4 3}"
        ".stations circle{stroke:#ffffff;stroke-width:1}"
        ".arrows path{stroke:#b3125f;stroke-width:1.1}.arrows .head{fill:#b3125f;stroke:none}"
        f"{hues}"
    )


def _key(top: float) -> str:
    """Explain colors and arrows."""
    bounds = [f"{100 * edge:g} %" for edge in SHARE_EDGES]
    texts = (
        f"under {bounds[0]} of the diagonal",
        *(f"to {bound}" for bound in bounds[1:]),
        f"over {bounds[-1]}",
    )
    parts, x = [], 14.0
    for hue, text in zip(_HUES, texts, strict=True):
        parts.append(
            f'<rect x="{x:g}" y="{top:g}" width="22" height="13" rx="2" fill="{hue}"/>'
            f'<text class="entry" x="{x + 28:g}" y="{top + 12:g}">{text}</text>'
        )
        x += 58.0 + 7.6 * len(text)
    parts.append(
        f'<text class="entry" x="14" y="{top + 42:g}">Arrows lead from where a true map of the '
        "same size has a station to where it is drawn; the grid is square on the ground. Not to "
        "scale.</text>"
    )
    return "".join(parts)
