"""Command `revise`: from an edition and a new feed to the next edition and its change sheet."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from gtfs_schematic.cli import options, words
from gtfs_schematic.cli.console import listening

if TYPE_CHECKING:
    from gtfs_schematic.revision import Revision

_EPILOG = """\b
Example:
  gtfs-schematic draw spring.zip --out spring
  gtfs-schematic revise spring summer.zip --out summer
"""

_WHERE = "changes.html and changes.csv list all"


@click.command(epilog=_EPILOG)
@options.edition
@options.feeds
@click.option(
    "--out",
    type=click.Path(path_type=Path),
    required=True,
    metavar="DIR",
    help="Folder to write; EDITION stays untouched.",
)
@options.overwrite
@options.feed_options
@options.draw_options
@options.adjustments
@options.as_json
@options.quiet
def revise(
    edition: Path,
    feeds: tuple[Path, ...],
    out: Path,
    **given: Any,  # noqa: ANN401 - the options of the registry
) -> int:
    """Redraw EDITION from FEED, a new timetable, and write what differs.

    What both have keeps its id and its place on the sheet; only what is new finds one. Beside the
    files of draw, the folder gets changes.html, changes.pdf, changes.csv and changes.json. What was
    set for EDITION holds again; options win over it, and a configuration takes its place. So do
    its adjustments, unless others are given.
    """
    adjustments = options.adjustments_from(given)
    from gtfs_schematic.edition.folder import (
        check_target,
        load_beside,
        load_edition,
        write_folder,
    )
    from gtfs_schematic.errors import UsageError

    if out.resolve() == (edition if edition.is_dir() else edition.parent).resolve():
        raise UsageError(f"{out} is the edition that is revised. Name another folder with --out.")
    check_target(out, overwrite=given["overwrite"])
    before = load_edition(edition)
    settings = options.settings_from(given, before.settings)
    folder = edition if edition.is_dir() else edition.parent
    diagram = options.read_bytes(folder / "diagram.svg", "diagram of the edition")
    from gtfs_schematic.revision import files_of_revision
    from gtfs_schematic.revision import revise as run

    with listening(quiet=given["quiet"]) as progress:
        beside = load_beside(edition, before)
        if beside.state is None:
            progress.note("no state.json beside the edition: what was merged is found by ids only")
        revision = run(
            before, feeds, settings, beside=beside, adjustments=adjustments, progress=progress
        )  # fmt: skip
        progress.phase("writing files")
        pdf = folder / "diagram.pdf"
        printed = pdf.read_bytes() if pdf.is_file() else b""
        files = files_of_revision(revision, before, diagram, printed)
    write_folder(out, files, overwrite=given["overwrite"])
    if given["as_json"]:
        click.echo(files["changes.json"])
    else:
        click.echo("\n".join(describe(revision, out)))
    return _judged(revision)


def _judged(revision: Revision) -> int:
    """Say if the drift has grown too much, and give the exit code."""
    from gtfs_schematic.edition.ratchet import advice
    from gtfs_schematic.errors import LimitExceededError

    result = revision.result
    told = advice(result.edition.drifts, result.settings.revision)
    if told:
        click.echo(f"Limit exceeded: {told}", err=True)
    return LimitExceededError.exit_code if told else 0


def describe(revision: Revision, out: Path) -> list[str]:
    """Write what changed, for people."""
    from gtfs_schematic.edition.change_words import stayed
    from gtfs_schematic.edition.ratchet import told as grown

    sheet, result = revision.sheet, revision.result
    rows = [f"{c.subject} {c.kind}: {c.name} ({c.id})" for c in sheet.large]
    missing = result.labelled.unplaced
    return [
        f"{result.edition.title}, {result.drawing.width_mm:g} × {result.drawing.height_mm:g} mm",
        words.service_date(result.network.info),
        f"Changes: {words.count(len(rows), 'change')}" if rows else "Changes: none",
        *words.first_few(rows, everything=len(rows) <= 30, where=_WHERE),
        *(
            ["Laid out anew: what is new found no room beside what stood"]
            if revision.anew
            else [f"Kept in place: {sheet.kept - sheet.moved_on_sheet} of {sheet.kept} stations"]
        ),
        *([stayed(sheet.stability)] if sheet.stability else []),
        *([drift] if (drift := grown(result.edition.drifts)) else []),
        *(f"Look at this match: {doubt}" for doubt in sheet.doubtful),
        *([f"Names without a place: {', '.join(missing)}"] if missing else ["Names: all placed"]),
        f"Written to {out}",
    ]
