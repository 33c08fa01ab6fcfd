"""One web page about an edition: the diagram, its lines and stations, findings and drift."""

from __future__ import annotations

from collections.abc import Iterable
from html import escape
from pathlib import Path

from gtfs_schematic.drift.measure import measure_edition
from gtfs_schematic.drift.model import CAUTION, DriftReport
from gtfs_schematic.edition.folder import load_edition
from gtfs_schematic.edition.model import Edition, EditionLine
from gtfs_schematic.errors import EditionError

_STYLE = """
body{font:16px/1.45 system-ui,sans-serif;margin:0;padding:1.2rem;color:#1b1f24;background:#fff}
.sheet{border:1px solid #c9ced6;overflow:auto}
.sheet>svg{display:block;width:100%;height:auto}
table{border-collapse:collapse}
th,td{text-align:left;vertical-align:top;padding:.25rem .8rem .25rem 0;
border-bottom:1px solid #c9ced6}
.swatch{display:inline-block;min-width:2.2em;padding:0 .4em;text-align:center;font-weight:600;
border:1px solid #1b1f24}
.caution{border-left:.3rem solid #a3470b;padding:.2rem .8rem;background:#fdf3ec}
nav a{margin-right:1rem}
"""


def page_of_folder(path: Path) -> bytes:
    """Make the page of the folder that draw wrote.

    Raises
    ------
    EditionError
        If the edition or its diagram cannot be read.
    """
    edition = load_edition(path)
    folder = path if path.is_dir() else path.parent
    file = folder / "diagram.svg"
    try:
        svg = file.read_bytes()
    except OSError as error:
        raise EditionError(
            f"{file}: cannot read the diagram ({error.strerror or error}). Draw the edition again."
        ) from error
    return page(edition, svg)


def page(edition: Edition, svg: bytes) -> bytes:
    """Make one page that needs nothing else: no script, no other file.

    Parameters
    ----------
    edition
        What the diagram shows.
    svg
        The diagram itself.

    Raises
    ------
    EditionError
        If `svg` holds no SVG.
    """
    text = svg.decode("utf-8", errors="replace")
    start = text.find("<svg")
    if start < 0:
        raise EditionError("diagram.svg: no <svg> element. Draw the edition again.")
    feed = edition.feed
    title = escape(edition.title)
    return f"""<!DOCTYPE html>
<html lang="en"><head><meta charset="utf-8">
<meta name="viewport" content="width=device-width,initial-scale=1">
<title>{title}</title><style>{_STYLE}</style></head><body>
<h1>{title}</h1>
<p>{escape(feed.publisher)} {escape(feed.version)}, valid {escape(feed.start_date) or "?"} to
{escape(feed.end_date) or "?"}, service of {escape(feed.service_date)}</p>
<nav><a href="#lines">Lines</a><a href="#stations">Stations</a><a href="#findings">Findings</a>
<a href="#left-out">Left out</a><a href="#drift">Drift</a></nav>
<div class="sheet">{text[start:].strip()}</div>
{_lines(edition)}{_stations(edition)}
{_list("findings", "Findings", edition.findings)}
{_list("left-out", "Left out", (f"{k} {i}: {why}" for k, i, why in edition.left_out))}
{_drift(measure_edition(edition))}
</body></html>
""".encode()


def _lines(edition: Edition) -> str:
    names = {station.id: station.name for station in edition.stations}
    rows = "".join(
        f"<tr><td>{_swatch(line)}</td><td>{_courses(line, names)}</td></tr>"
        for line in edition.lines
    )
    return _table("lines", "Lines", ("Line", "Stations in order"), rows)


def _swatch(line: EditionLine) -> str:
    style = f"background:{line.color};color:{line.text_color}"
    return f'<span class="swatch" style="{style}">{escape(line.name)}</span>'


def _courses(line: EditionLine, names: dict[str, str]) -> str:
    return "<br>".join(
        escape(" – ".join(names[key] for key in itinerary)) for itinerary in line.itineraries
    )


def _stations(edition: Edition) -> str:
    lines = {line.id: line.name for line in edition.lines}
    ranked = sorted(edition.stations, key=lambda s: (s.name.casefold(), s.id))
    rows = "".join(
        f"<tr><td>{escape(s.name)}</td><td>{escape(s.id)}</td><td>{s.kind}</td>"
        f"<td>{escape(', '.join(lines[key] for key in s.lines))}</td></tr>"
        for s in ranked
    )
    return _table("stations", "Stations", ("Name", "Id", "Kind", "Lines"), rows)


def _drift(report: DriftReport) -> str:
    figures = report.summary
    rows = "".join(
        f"<tr><td>{name}</td><td>{value}</td></tr>"
        for name, value in (
            ("Residual, north kept up", f"{report.north_up.residual:.4f}"),
            ("Residual, free", f"{report.free.residual:.4f}"),
            ("Largest displacement", f"{100 * figures.displacement_max_share:.1f} % of diagonal"),
            ("Mean change of bearing", f"{figures.bearing_mean_deg:.1f}°"),
        )
    )
    table = _table("drift", "Drift", ("Measure", "Value"), rows)
    return f'{table}<p class="caution">{escape(CAUTION)}</p>'


def _table(anchor: str, title: str, head: Iterable[str], rows: str) -> str:
    cells = "".join(f'<th scope="col">{cell}</th>' for cell in head)
    return (
        f'<h2 id="{anchor}">{title}</h2><table><thead><tr>{cells}</tr></thead>'
        f"<tbody>{rows}</tbody></table>"
    )


def _list(anchor: str, title: str, rows: Iterable[str]) -> str:
    items = "".join(f"<li>{escape(row)}</li>" for row in rows)
    return f'<h2 id="{anchor}">{title}</h2>{f"<ul>{items}</ul>" if items else "<p>None.</p>"}'
