"""Command `drift`: measure an edition against the ground, without its feed."""

from __future__ import annotations

from pathlib import Path

import click

from gtfs_schematic.cli import options, words
from gtfs_schematic.errors import LimitExceededError

_EPILOG = """\b
Example:
  gtfs-schematic drift diagram --limit 'residual<0.1' --limit 'bearing<90'
"""


@click.command(epilog=_EPILOG)
@options.edition
@options.limit
@options.as_json
@click.option("--csv", "as_csv", is_flag=True, help="Write CSV on standard output.")
def drift(edition: Path, limits: tuple[str, ...], *, as_json: bool, as_csv: bool) -> int:
    """Measure how far EDITION departs from geography.

    EDITION is the folder that draw wrote, or its edition.json.
    """
    from gtfs_schematic.drift.limits import judge, parse_limit
    from gtfs_schematic.drift.measure import measure_edition
    from gtfs_schematic.drift.model import CAUTION
    from gtfs_schematic.drift.report import to_csv, to_json
    from gtfs_schematic.edition.folder import load_edition

    wanted = [parse_limit(text) for text in limits]
    if as_json and as_csv:
        raise click.UsageError("Give --json or --csv, not both.")
    loaded = load_edition(edition)
    report = measure_edition(loaded)
    results = judge(report, wanted)
    if as_json:
        click.echo(to_json(report, results), nl=False)
    elif as_csv:
        click.echo(to_csv(report), nl=False)
    else:
        lines = [loaded.title, *words.drift(report), *words.limits(results), f"Caution: {CAUTION}"]
        click.echo("\n".join(lines))
    over = [result for result in results if result.exceeded]
    if over and (as_json or as_csv):
        click.echo("\n".join(words.limits(over)), err=True)
    return LimitExceededError.exit_code if over else 0
