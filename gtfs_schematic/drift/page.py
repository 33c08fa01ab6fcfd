"""Write a drift report as one web page that needs nothing else."""

from __future__ import annotations

import re
from collections.abc import Sequence
from html import escape

from gtfs_schematic.drift.chart import arrows, histogram
from gtfs_schematic.drift.limits import LimitResult
from gtfs_schematic.drift.model import CAUTION, DriftReport
from gtfs_schematic.errors import EditionError

_STYLE = """
body{font:16px/1.45 system-ui,sans-serif;margin:0 auto;padding:1.2rem;max-width:76rem;
color:#1b1f24;background:#fff}
table{border-collapse:collapse;margin:.6rem 0}
th,td{text-align:left;padding:.25rem .8rem .25rem 0;border-bottom:1px solid #c9ced6}
td.n,th.n{text-align:right;font-variant-numeric:tabular-nums}
.caution{border-left:.3rem solid #a3470b;padding:.2rem .8rem;background:#fdf3ec}
.over{color:#9c1c1c;font-weight:600}
.charts{display:flex;flex-wrap:wrap;gap:1.5rem}
.charts figure{margin:0;flex:1 1 20rem}
.chart{width:100%;max-width:34rem;height:auto}
.chart rect{fill:#3d5a80}
.chart text{font:11px system-ui,sans-serif;text-anchor:middle;fill:#1b1f24}
.sheet{position:relative;border:1px solid #c9ced6}
.sheet>svg{display:block;width:100%;height:auto}
.sheet>svg.arrows{position:absolute;inset:0;overflow:visible}
.arrows path{stroke:#c2185b;stroke-width:.5;fill:none}
.arrows .head{fill:#c2185b;stroke:none}
.arrows circle{fill:#fff;stroke:#c2185b;stroke-width:.35}
#show:not(:checked)~.sheet .arrows{display:none}
details{margin:.8rem 0}
"""

_SHARE_EDGES = (0, 1, 2, 4, 6, 8, 12, 16, 24)
_BEARING_EDGES = (0, 5, 10, 15, 22.5, 45, 90)


def to_html(
    report: DriftReport, svg: bytes, *, title: str, limits: Sequence[LimitResult] = ()
) -> bytes:
    """Write the page: figures, charts, tables, and the diagram with displacement arrows.

    Parameters
    ----------
    report
        What was measured.
    svg
        The diagram; its ``viewBox`` is in sheet millimetres.
    title
        Title of the edition.
    limits
        What became of the limits that the user set.

    Raises
    ------
    EditionError
        If `svg` is no SVG with a ``viewBox``.
    """
    text = svg.decode("utf-8")
    start = text.find("<svg")
    box = re.search(r'viewBox="([^"]+)"', text)
    if start < 0 or box is None:
        raise EditionError("diagram.svg: no <svg> element with a viewBox. Draw the edition again.")
    share = [100.0 * station.displacement_share for station in report.stations]
    change = [abs(k.bearing_change_deg) for k in report.links if k.bearing_change_deg is not None]
    name = escape(title)
    body = f"""<!DOCTYPE html>
<html lang="en"><head><meta charset="utf-8">
<meta name="viewport" content="width=device-width,initial-scale=1">
<title>Drift of {name}</title><style>{_STYLE}</style></head><body>
<h1>Drift of {name}</h1>
<p>How far and how the diagram departs from geography.</p>
<p class="caution">{escape(CAUTION)}</p>
{_limits(limits)}{_fits(report)}{_summary(report)}
<h2>Spread</h2><div class="charts">
<figure>{histogram(share, _SHARE_EDGES, "Stations by displacement", "% of the diagonal")}
<figcaption>Stations by displacement</figcaption></figure>
<figure>{histogram(change, _BEARING_EDGES, "Links by bearing change", "degrees")}
<figcaption>Links by change of bearing</figcaption></figure></div>
<h2>On the diagram</h2>
<p>Each arrow leads from where the station would lie on a true map of the same size to where it
is drawn.</p>
<input type="checkbox" id="show" checked> <label for="show">Show the arrows</label>
<div class="sheet">{text[start:].strip()}{arrows(report, box.group(1))}</div>
{_stations(report)}{_links(report)}
</body></html>
"""
    return body.encode()


def _limits(limits: Sequence[LimitResult]) -> str:
    if not limits:
        return ""
    rows = "".join(
        f"<tr><td>{escape(str(result.limit))}</td><td class=n>{result.measured:.4g}</td>"
        f"<td{' class=over>exceeded' if result.exceeded else '>kept'}</td></tr>"
        for result in limits
    )
    return _table("Limits", ("Limit", "Measured", "Result"), rows)


def _fits(report: DriftReport) -> str:
    rows = "".join(
        f"<tr><td>{name}</td><td class=n>{fit.scale_mm_per_km:.2f}</td>"
        f"<td class=n>{fit.rotation_deg:.1f}</td><td class=n>{fit.residual:.4f}</td></tr>"
        for name, fit in (("North kept up", report.north_up), ("Free", report.free))
    )
    head = ("Best fit", "Scale, mm per km", "Turn, degrees", "Residual (0 true to scale)")
    return _table("Likeness to a true map", head, rows)


def _summary(report: DriftReport) -> str:
    figures = report.summary
    lines = (
        ("Median displacement", f"{100 * figures.displacement_median_share:.1f} % of the diagonal"),
        ("Largest displacement", f"{100 * figures.displacement_max_share:.1f} % of the diagonal"),
        ("Diagonal of the network", f"{report.diagonal_m / 1000:.1f} km"),
        ("Mean change of bearing, by length", f"{figures.bearing_mean_deg:.1f}°"),
        ("95 % of links change by less than", f"{figures.bearing_p95_deg:.1f}°"),
        ("Length that turns by more than 45°", f"{100 * figures.bearing_over_45:.1f} %"),
        ("Length that turns by more than 90°", f"{100 * figures.bearing_over_90:.1f} %"),
        ("Unevenness of scale (s.d. of log length ratio)", f"{figures.log_length_sd:.2f}"),
        ("Pairs in turned-round order", f"{100 * figures.order_flips:.1f} %"),
        ("Correlation of true and drawn distance", f"{figures.distance_correlation:.2f}"),
    )
    rows = "".join(f"<tr><td>{name}</td><td class=n>{value}</td></tr>" for name, value in lines)
    return _table("In a few figures", ("Measure", "Value"), rows)


def _stations(report: DriftReport) -> str:
    ranked = sorted(report.stations, key=lambda s: (-s.displacement_m, s.station_id))
    rows = "".join(
        f"<tr><td>{escape(s.name)}</td><td>{escape(s.station_id)}</td>"
        f"<td class=n>{s.displacement_m:.0f}</td><td class=n>{s.direction_deg:.0f}</td>"
        f"<td class=n>{100 * s.displacement_share:.1f}</td></tr>"
        for s in ranked
    )
    head = ("Station", "Id", "Displacement, m", "Towards, degrees", "% of diagonal")
    return f"<details><summary>All stations, farthest first</summary>{_rows(head, rows)}</details>"


def _links(report: DriftReport) -> str:
    ranked = sorted(report.links, key=lambda k: (-abs(k.bearing_change_deg or 0.0), k.link_id))
    rows = "".join(
        f"<tr><td>{escape(k.link_id)}</td><td class=n>{k.true_length_m:.0f}</td>"
        f"<td class=n>{k.drawn_length_mm:.1f}</td>"
        f"<td class=n>{_known(k.bearing_change_deg, 1)}</td>"
        f"<td class=n>{_known(k.length_ratio, 2)}</td></tr>"
        for k in ranked
    )
    head = ("Link", "True, m", "Drawn, mm", "Turn, degrees", "Length ratio")
    return f"<details><summary>All links, most turned first</summary>{_rows(head, rows)}</details>"


def _known(value: float | None, digits: int) -> str:
    return "–" if value is None else f"{value:.{digits}f}"


def _table(title: str, head: Sequence[str], rows: str) -> str:
    return f"<h2>{title}</h2>{_rows(head, rows)}"


def _rows(head: Sequence[str], rows: str) -> str:
    cells = "".join(f'<th scope="col">{escape(cell)}</th>' for cell in head)
    return f"<table><thead><tr>{cells}</tr></thead><tbody>{rows}</tbody></table>"
