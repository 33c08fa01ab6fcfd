"""Small charts as inline SVG: a histogram, and arrows over a diagram."""

from __future__ import annotations

import math
from collections.abc import Sequence
from html import escape

import numpy as np

from gtfs_schematic.drift.model import DriftReport

_WIDTH, _HEIGHT, _FOOT = 360.0, 150.0, 34.0
_LEAST_ARROW_MM = 0.8


def histogram(values: Sequence[float], edges: Sequence[float], title: str, unit: str) -> str:
    """Draw how many values lie between neighbouring edges; the last class is open above.

    Parameters
    ----------
    values
        What is counted; none below the first edge.
    edges
        Class bounds, ascending, in `unit`.
    title
        What is counted, for the text alternative too.
    unit
        Unit written behind the bounds.
    """
    bounds = np.array([*edges, math.inf])
    counts = np.histogram(np.asarray(values, dtype=np.float64), bounds)[0]
    most = max(int(counts.max(initial=0)), 1)
    step = _WIDTH / len(counts)
    room = _HEIGHT - _FOOT - 16.0
    box = f"0 0 {_WIDTH:g} {_HEIGHT:g}"
    parts = [f'<svg class="chart" viewBox="{box}" role="img" aria-label="{escape(title)}">']
    for i, count in enumerate(counts):
        tall = room * int(count) / most
        top = _HEIGHT - _FOOT - tall
        middle = (i + 0.5) * step
        last = i == len(counts) - 1
        name = f"{edges[i]:g}+" if last else f"{edges[i]:g}–{edges[i + 1]:g}"
        parts.append(
            f'<rect x="{i * step + 2:.1f}" y="{top:.1f}" width="{step - 4:.1f}" '
            f'height="{tall:.1f}"/>'
            f'<text x="{middle:.1f}" y="{top - 3:.1f}">{int(count)}</text>'
            f'<text x="{middle:.1f}" y="{_HEIGHT - _FOOT + 13:.1f}">{name}</text>'
        )
    parts.append(f'<text x="{_WIDTH / 2:g}" y="{_HEIGHT - 4:g}">{escape(unit)}</text></svg>')
    return "".join(parts)


def arrows(report: DriftReport, view_box: str) -> str:
    """Draw an arrow from where each station would lie to scale to where it is drawn.

    Parameters
    ----------
    report
        Places in sheet millimetres, y down.
    view_box
        The diagram's own ``viewBox``, so that both lie on each other.
    """
    parts = [f'<svg class="arrows" viewBox="{escape(view_box)}" aria-hidden="true">']
    for station in report.stations:
        (x, y), (u, v) = station.true_mm, station.drawn_mm
        length = math.hypot(u - x, v - y)
        if length < _LEAST_ARROW_MM:
            continue
        head = min(2.2, 0.4 * length)
        along = ((u - x) / length, (v - y) / length)
        base = (u - head * along[0], v - head * along[1])
        side = (-along[1] * head * 0.4, along[0] * head * 0.4)
        parts.append(
            f"<g><title>{escape(station.name)}: {station.displacement_m:.0f} m</title>"
            f'<circle cx="{x:.2f}" cy="{y:.2f}" r="0.7"/>'
            f'<path d="M{x:.2f} {y:.2f}L{base[0]:.2f} {base[1]:.2f}"/>'
            f'<path class="head" d="M{u:.2f} {v:.2f}L{base[0] + side[0]:.2f} '
            f'{base[1] + side[1]:.2f}L{base[0] - side[0]:.2f} {base[1] - side[1]:.2f}Z"/></g>'
        )
    parts.append("</svg>")
    return "".join(parts)
