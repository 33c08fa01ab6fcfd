"""Small charts as inline SVG."""

from __future__ import annotations

import math
from collections.abc import Sequence
from html import escape

import numpy as np

_WIDTH, _HEIGHT, _FOOT = 360.0, 150.0, 34.0


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
