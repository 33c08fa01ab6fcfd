"""Write a drift report as one web page that needs nothing else."""

from __future__ import annotations

import importlib.resources
import itertools
import json
from collections.abc import Sequence
from dataclasses import dataclass
from html import escape

from gtfs_schematic.drift.chart import histogram
from gtfs_schematic.drift.figure import Figure, written
from gtfs_schematic.drift.figures import FIGURES
from gtfs_schematic.drift.limits import LimitResult
from gtfs_schematic.drift.model import CAUTION, DriftReport
from gtfs_schematic.drift.picture import SCALE_EDGES, SHARE_EDGES, TURN_EDGES, picture
from gtfs_schematic.drift.placed import Diagram
from gtfs_schematic.drift.tables import tables
from gtfs_schematic.drift.verdict import verdict_of

_SHARE_BOUNDS = (0, 1, 2, 4, 6, 8, 12, 16, 24)
_BEARING_BOUNDS = (0, 5, 10, 15, 22.5, 45, 90)
_RATIO_BOUNDS = (0, 0.25, 0.5, 0.8, 1.25, 2, 4)

_MANY = 150
"""Of more stations than these, marks are hard to see without coming closer."""

_TOP = ("displacement-p95", "bearing-over-45", "octant-agreement", "planning-error-over-1.15")


@dataclass(frozen=True, slots=True)
class Beside:
    """Another drawing of the same network, to be told side by side."""

    title: str
    report: DriftReport
    diagram: Diagram


def to_html(
    report: DriftReport,
    diagram: Diagram,
    *,
    title: str,
    limits: Sequence[LimitResult] = (),
    beside: Beside | None = None,
) -> bytes:
    """Write the page: a verdict, the network that moves, tables, charts and definitions.

    Parameters
    ----------
    report
        What was measured.
    diagram
        Of what; for the courses of links.
    title
        Title of the diagram.
    limits
        What became of the limits that the user set.
    beside
        Another drawing to compare with.
    """
    name = escape(title)
    # A table of places does not say its unit.
    unit = "units" if beside else "mm"
    svg, data = picture(report, diagram, label=f"The network of {title} as drawn")
    # A script ends at "</", wherever it stands.
    places = json.dumps(data, ensure_ascii=False, separators=(",", ":")).replace("</", "<\\/")
    body = f"""<!DOCTYPE html>
<html lang="en"><head><meta charset="utf-8">
<meta name="viewport" content="width=device-width,initial-scale=1">
<title>Drift of {name}</title><link rel="icon" href="data:,">
<style>{_resource("page.css")}</style></head><body>
<header><h1>Drift of {name}</h1>
<p class="soft">How far the diagram departs from the ground, and whom it misleads.</p></header>
<main>{_key_figures(report, unit)}{_verdict(report)}{_limits(limits)}
<div class="board"><section class="stage" aria-label="Picture">
{_stage(svg, len(report.stations))}</section><section aria-label="Tables"><h2>Look closer</h2>
<p class="soft">Choose a name to mark it on the picture; choose it again, or press Escape, to
clear. Heads of columns sort.</p>{tables(report, diagram, unit)}</section></div>
{_charts(report)}{_other(beside)}{_figures(report, beside)}
<p class="caution">{escape(CAUTION)}</p></main>
<script type="application/json" id="data">{places}</script>
<script>{_resource("page.js")}</script></body></html>
"""
    return body.encode()


def _resource(name: str) -> str:
    return (importlib.resources.files(__package__) / name).read_text("utf-8")


def _named(name: str) -> Figure:
    return next(figure for figure in FIGURES if figure.name == name)


def _key_figures(report: DriftReport, unit: str) -> str:
    cells = "".join(
        f"<div><dt>{escape(_named(name).label)}</dt>"
        f"<dd>{written(_named(name), _named(name).read(report))}</dd></div>"
        for name in _TOP
    )
    scale = (
        "<div><dt>Scale, north up</dt>"
        f"<dd>{report.north_up.scale_mm_per_km:.3g} {unit} per km</dd></div>"
    )
    return f'<dl class="key-figures">{cells}{scale}</dl>'


def _verdict(report: DriftReport) -> str:
    verdict = verdict_of(report)
    parts = (
        ("good", "What holds", verdict.good),
        ("bad", "What to look at", verdict.bad),
    )
    sections = (
        f'<section class="{kind}"><h2>{head}</h2>'
        f"<ul>{''.join(f'<li>{escape(text)}</li>' for text in texts)}</ul></section>"
        for kind, head, texts in parts
        if texts
    )
    return f'<div class="verdict">{"".join(sections)}</div>'


def _limits(limits: Sequence[LimitResult]) -> str:
    if not limits:
        return ""
    rows = "".join(
        f"<tr><td>{escape(result.limit.figure.label)}</td><td><code>{escape(str(result.limit))}"
        f'</code></td><td class="n">{result.written}</td>'
        f"<td{' class=over>exceeded' if result.exceeded else '>kept'}</td></tr>"
        for result in limits
    )
    head = "".join(f'<th scope="col">{cell}</th>' for cell in ("Measure", "Limit"))
    return (
        f'<section class="wide"><h2>Limits</h2><table class="limits"><thead><tr>{head}'
        f'<th scope="col" class="n">Measured</th><th scope="col">Result</th></tr></thead>'
        f"<tbody>{rows}</tbody></table></section>"
    )


def _stage(svg: str, stations: int) -> str:
    close = " checked" if stations > _MANY else ""
    hues = (("d", "displacement"), ("t", "turn"), ("s", "scale"))
    radios = "".join(
        f'<label><input type="radio" name="hue" value="{key}"{" checked" if key == "d" else ""}> '
        f"{word}</label>"
        for key, word in hues
    )
    boxes = "".join(
        f'<label><input type="checkbox" data-toggles="{key}" checked> {word}</label>'
        for key, word in (("arrows", "arrows"), ("grid", "grid"))
    )
    return f"""<figure id="figure" data-hue="d"><div class="controls">
<div class="slide"><label for="move">Ground</label>
<input type="range" id="move" min="0" max="100" step="1" value="100"
 aria-label="From the ground to the diagram"><span aria-hidden="true">Diagram</span></div>
<fieldset><legend>Color shows</legend>{radios}</fieldset>
<fieldset><legend>Show</legend>{boxes}
<label><input type="checkbox" id="zoom"{close}> marks close up</label></fieldset></div>
{svg}{_legends()}<p class="said soft" id="said" aria-live="polite">Each arrow leads from where a
true map of the same size has a station to where it is drawn; the grid is square on the ground.
</p></figure>"""


def _legends() -> str:
    shares = [f"{100 * edge:g} %" for edge in SHARE_EDGES]
    turns = [f"{abs(edge):g}°" for edge in TURN_EDGES]
    scales = [f"{edge:g}" for edge in SCALE_EDGES]
    return "".join(
        f'<ul class="legend {key}" aria-label="{label}">'
        + "".join(
            f'<li><i style="background:var(--{hue}{i})"></i>{text}</li>'
            for i, text in enumerate(texts)
        )
        + "</ul>"
        for key, hue, label, texts in (
            (
                "d",
                "d",
                "Displacement, share of the diagonal",
                (
                    f"under {shares[0]} of the diagonal",
                    *(f"{a} to {b}" for a, b in itertools.pairwise(shares)),
                    f"over {shares[-1]}",
                ),
            ),
            (
                "t",
                "v",
                "Turn",
                (
                    f"over {turns[0]} left",
                    f"over {turns[1]} left",
                    "about true",
                    f"over {turns[2]} right",
                    f"over {turns[3]} right",
                ),
            ),
            (
                "s",
                "v",
                "Scale against the typical one",
                (
                    f"under {scales[0]} of the typical scale",
                    f"{scales[0]} to {scales[1]}",
                    "about typical",
                    f"{scales[2]} to {scales[3]}",
                    f"over {scales[3]}",
                ),
            ),
        )
    )


def _charts(report: DriftReport) -> str:
    share = [100.0 * station.displacement_share for station in report.stations]
    change = [abs(k.bearing_change_deg) for k in report.links if k.bearing_change_deg is not None]
    ratio = [k.length_ratio for k in report.links if k.length_ratio is not None]
    charts = (
        (share, _SHARE_BOUNDS, "Stations by displacement", "% of the diagonal"),
        (change, _BEARING_BOUNDS, "Links by turn", "degrees, either way"),
        (ratio, _RATIO_BOUNDS, "Links by length ratio", "drawn over true, 1 is typical"),
    )
    figures = "".join(
        f"<figure><h3>{title}</h3>{histogram(values, bounds, title, unit)}</figure>"
        for values, bounds, title, unit in charts
    )
    return f'<section class="charts" aria-label="Charts">{figures}</section>'


def _other(beside: Beside | None) -> str:
    if beside is None:
        return ""
    label = f"The network of {beside.title} as drawn"
    svg, _ = picture(beside.report, beside.diagram, label=label)
    still = svg.replace('class="net"', 'class="net still"', 1)
    return (
        f"<section><h2>Beside it: {escape(beside.title)}</h2>"
        f'<figure class="sheet-other" data-hue="d">{still}</figure></section>'
    )


def _figures(report: DriftReport, beside: Beside | None) -> str:
    other = '<th scope="col" class="n">Beside it</th>' if beside else ""
    rows = "".join(
        f"<tr><td>{escape(figure.label)}<br><code>{figure.name}</code></td>"
        f'<td class="n">{written(figure, figure.read(report))}</td>'
        + (f'<td class="n">{written(figure, figure.read(beside.report))}</td>' if beside else "")
        + f"<td>{escape(figure.meaning)}</td></tr>"
        for figure in FIGURES
    )
    head = "This drawing" if beside else "Value"
    return f"""<section class="figures"><h2>Every figure and what it means</h2>
<p class="soft">The names in code are those of limits and of <code>drift.json</code>. The network's
diagonal is {report.diagonal_m / 1000.0:.1f} km.</p>
<div class="wide"><table><thead><tr><th scope="col">Measure</th>
<th scope="col" class="n">{head}</th>{other}<th scope="col">Meaning</th></tr></thead><tbody>
{rows}</tbody></table></div></section>"""
