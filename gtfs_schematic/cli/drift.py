"""Command `drift`: measure an edition, or another drawing of its network, against the ground."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from gtfs_schematic.cli import options, words
from gtfs_schematic.errors import EditionError, LimitExceededError

if TYPE_CHECKING:
    from gtfs_schematic.drift.limits import LimitResult
    from gtfs_schematic.drift.model import DriftReport, DriftSettings
    from gtfs_schematic.drift.page import Beside
    from gtfs_schematic.drift.placed import Diagram
    from gtfs_schematic.drift.redrawn import Redrawn
    from gtfs_schematic.edition.model import Edition

MEASURES = """
residual residual-free rotation displacement-median displacement-p95 displacement-max
displacement-max-m bearing-mean bearing-p95 bearing-max bearing-over-22.5 bearing-over-45
bearing-over-90 length-spread length-correlation length-rank-correlation
distance-correlation distance-rank-correlation order-flips octant-agreement
neighbor-agreement trustworthiness continuity false-neighbors hidden-walks competing-routes
planning-error-mean planning-error-p95 planning-error-max planning-error-over-1.05
planning-error-over-1.15 planning-error-over-1.3 planning-error-over-1.5
planning-error-over-2
"""
"""Written out, so that help need not import what measures."""

_LINES = MEASURES.strip().replace("\n", "\n  ")
_EPILOG = f"""\b
Names of measures for --limit; drift.html tells what each means:
  {_LINES}
Shares may be given as percent. Of correlations, agreements, trustworthiness and
continuity more is better: their limit is the least.

\b
Example:
  gtfs-schematic drift diagram --limit displacement-p95=8% --limit bearing-over-90=0
  gtfs-schematic drift diagram --positions today.csv --y-axis up --out compared
"""


@click.command(epilog=_EPILOG)
@options.edition
@click.option(
    "--positions",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Measure another drawing: CSV with the columns stop_id, x, y in any unit.",
)
@click.option(
    "--y-axis",
    type=click.Choice(["down", "up"]),
    default="down",
    show_default=True,
    help="Which way y grows in --positions.",
)
@click.option(
    "--out",
    type=click.Path(path_type=Path),
    metavar="DIR",
    help="Write drift.html, drift.json, drift.csv and plots (drift.svg, drift.png) into a folder.",
)
@options.overwrite
@options.config
@options.limit
@options.as_json
@click.option("--csv", "as_csv", is_flag=True, help="Write CSV on standard output.")
def drift(edition: Path, **given: Any) -> int:  # noqa: ANN401 - the options of the registry
    """Measure how far EDITION departs from geography, and whom it misleads.

    EDITION is the folder that draw wrote, or its edition.json. With --positions another drawing of
    the same network is measured, and told beside the edition.
    """
    settings = options.settings_from(given).drift
    from gtfs_schematic.drift.limits import judge, limits_of
    from gtfs_schematic.edition.folder import load_edition

    limits = limits_of(settings, given["limits"])
    if given["as_json"] and given["as_csv"]:
        raise click.UsageError("Give --json or --csv, not both.")
    loaded = load_edition(edition)
    measured = _Measured(loaded, settings, given)
    results = judge(measured.report, limits)
    if given["out"] is not None:
        options.write_report(given["out"], _files(measured, results), overwrite=given["overwrite"])
    _say(measured, results, given)
    over = [result for result in results if result.exceeded]
    return LimitExceededError.exit_code if over else 0


class _Measured:
    """What is measured: the edition, or another drawing with the edition beside it."""

    def __init__(self, edition: Edition, settings: DriftSettings, given: Mapping[str, Any]) -> None:
        from gtfs_schematic.drift.measure import measure_edition
        from gtfs_schematic.drift.page import Beside

        self.title, self.diagram = edition.title, _diagram(edition)
        self.beside: Beside | None = None
        self.missing: tuple[str, ...] = ()
        if given["positions"] is not None:
            other = _other(edition, given["positions"], y_up=given["y_axis"] == "up")
            own = measure_edition(edition, settings)
            self.beside = Beside(f"{edition.title} (this edition)", own, edition)
            self.title, self.diagram = f"{edition.title} ({given['positions'].name})", other
            self.missing = other.missing
        self.report: DriftReport = measure_edition(self.diagram, settings)


def _diagram(edition: Edition) -> Diagram:
    return edition


def _other(edition: Edition, file: Path, *, y_up: bool) -> Redrawn:
    from gtfs_schematic.drift.redrawn import places_from_csv, redrawn

    data = options.read_bytes(file, "table of positions")
    try:
        return redrawn(edition, places_from_csv(data, y_up=y_up))
    except EditionError as error:
        raise EditionError(f"{file}: {error}") from error


def _files(measured: _Measured, results: tuple[LimitResult, ...]) -> dict[str, bytes]:
    from gtfs_schematic.drift.page import to_html
    from gtfs_schematic.drift.plot import to_png, to_svg
    from gtfs_schematic.drift.report import to_csv

    title, report, diagram = measured.title, measured.report, measured.diagram
    plot = to_svg(report, diagram, title=title)
    return {
        "drift.html": to_html(report, diagram, title=title, limits=results, beside=measured.beside),
        "drift.json": _json(measured, results),
        "drift.csv": to_csv(report),
        "drift.svg": plot,
        "drift.png": to_png(plot),
    }


def _json(measured: _Measured, results: tuple[LimitResult, ...]) -> bytes:
    from gtfs_schematic.drift.report import to_json

    beside = measured.beside
    return to_json(measured.report, results, (beside.title, beside.report) if beside else None)


def _say(measured: _Measured, results: tuple[LimitResult, ...], given: Mapping[str, Any]) -> None:
    from gtfs_schematic.drift.model import CAUTION
    from gtfs_schematic.drift.report import to_csv

    over = [result for result in results if result.exceeded]
    if given["as_json"] or given["as_csv"]:
        told = _json(measured, results) if given["as_json"] else to_csv(measured.report)
        click.echo(told, nl=False)
        if over:
            click.echo("\n".join(words.limits(over)), err=True)
        return
    lines = [measured.title, *words.drift(measured.report)]
    if measured.missing:
        missing = words.first_few(measured.missing, everything=False, where="not in the table")
        lines += [f"Without a position: {words.count(len(measured.missing), 'station')}", *missing]
    if measured.beside is not None:
        lines += words.side_by_side(measured.report, measured.beside.report)
    lines += [*words.limits(results), f"Caution: {CAUTION}"]
    if given["out"] is not None:
        lines.append(f"Written to {given['out']}: drift.html, drift.json, drift.csv and plots")
    click.echo("\n".join(lines))
