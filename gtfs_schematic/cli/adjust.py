"""Command `adjust`: set one adjustment of an edition, and redraw what it touches."""

from __future__ import annotations

import json
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from gtfs_schematic.cli import options, words
from gtfs_schematic.cli.console import listening
from gtfs_schematic.cli.saying import adjusted_by, is_about, kind_of
from gtfs_schematic.errors import UsageError

if TYPE_CHECKING:
    from gtfs_schematic.adjusting import Redrawn

_EPILOG = """\b
Example:
  gtfs-schematic adjust diagram --station "Mill Lane" --label-side NE
  gtfs-schematic adjust diagram --station 183 --pin 120,80
  gtfs-schematic adjust diagram --station 183 --beside 152 --right 25 --below 0
  gtfs-schematic adjust diagram --line m1 --color "#225577"
  gtfs-schematic adjust diagram --link 101 121 --direction E --order m4,m3
  gtfs-schematic adjust diagram --merge 331 --merge 332 --name "Both Quays"
  gtfs-schematic adjust diagram --station 183 --drop pin_mm
"""


@click.command(epilog=_EPILOG)
@options.edition
@click.option("--station", metavar="ID", help="A station, by id, stop or name, is adjusted.")
@click.option("--line", metavar="ID", help="A line, by id, route or name, is adjusted.")
@click.option("--link", nargs=2, metavar="ID ID", help="The link from one station to the next is.")
@click.option("--merge", multiple=True, metavar="ID", help="Make one station of these; repeat.")
@click.option("--group", multiple=True, metavar="ID", help="Make one line of these; repeat.")
@click.option("--split", metavar="ID", help="Make several stations of this one: with --part.")
@click.option("--word", metavar="WORD", help="A word of names is written otherwise: with --short.")
@click.option("--name", metavar="TEXT", help="Its name.")
@click.option("--short-name", metavar="TEXT", help="What a station's label says instead.")
@click.option("--rows", metavar="TEXT/TEXT", help="The same row by row, with / between the rows.")
@click.option("--label-side", metavar="SIDE", help="E, NE, N, NW, W, SW, S or SE of the marker.")
@click.option(
    "--label-angle",
    type=click.Choice(["-45", "0", "45", "90"]),
    help="Degrees by which the name rises.",
)
@click.option("--pin", metavar="X,Y", help="Its place: millimetres from the sheet's left and top.")
@click.option("--beside", metavar="ID", help="Its place is seen from this station, …")
@click.option("--right", type=float, metavar="MM", help="… so far to the right (to the left: -) …")
@click.option("--below", type=float, metavar="MM", help="… and so far below (above: -).")
@click.option("--straight", multiple=True, metavar="LINE", help="This line passes it straight.")
@click.option("--hide", is_flag=True, help="A station is passed, or a line not drawn.")
@click.option("--color", metavar="#RRGGBB", help="Color of a line.")
@click.option("--text-color", metavar="#RRGGBB", help="Color of letters on it.")
@click.option("--direction", metavar="SIDE", help="Where a link leads from its first station.")
@click.option("--order", metavar="LINE,LINE", help="A link's lines, left to right on that way.")
@click.option(
    "--part", multiple=True, metavar="STOP,STOP[=NAME]", help="Stops of one part; repeat."
)
@click.option("--short", metavar="TEXT", help="What is written for --word.")
@click.option("--note", metavar="TEXT", help="A remark that stays with the adjustment.")
@click.option("--drop", multiple=True, metavar="WHAT", help="Take back what was said, or all.")
@click.option(
    "--out",
    type=click.Path(path_type=Path),
    metavar="DIR",
    help="Write another edition there, and leave EDITION as it is.",
)
@options.overwrite
@options.as_json
@options.quiet
def adjust(edition: Path, **given: Any) -> int:  # noqa: ANN401 - the options of the registry
    """Set one adjustment of EDITION, and redraw what it touches: all files or none.

    Say first what it is about (--station, --line, --link, …), then what it is to be. What you say
    joins the edition's adjustments, and holds in its revisions, too. The feed is not needed.
    """
    kind = kind_of(given)
    from gtfs_schematic.adjusting import adjust_edition, files_of_redrawn
    from gtfs_schematic.edition.adjustments import adjustments_of
    from gtfs_schematic.edition.folder import (
        check_target,
        digest_of_edition,
        load_edition,
        load_state,
        write_folder,
    )

    folder = edition if edition.is_dir() else edition.parent
    out = given["out"] or folder
    in_place = out.resolve() == folder.resolve()
    check_target(out, overwrite=in_place or given["overwrite"])
    before = load_edition(edition)
    state = load_state(edition, before)
    if state is None:
        raise UsageError(
            f"{folder}: no state.json beside the edition, so it cannot be redrawn without its "
            "feed. Draw it anew, or revise it with its own feed."
        )
    said = adjustments_of(before.adjustments, "adjustments of the edition")
    now = adjusted_by(said, state.network, given)
    with listening(quiet=given["quiet"]) as progress:
        redrawn = adjust_edition(before, state, now, progress=progress)
        fresh = [text for text in redrawn.stale if is_about(text, kind, given)]
        if fresh and not given["drop"]:
            raise UsageError(f"{fresh[0]}.")
        if not in_place:
            redrawn = redrawn.revising(digest_of_edition(edition))
        progress.phase("writing files")
        files = files_of_redrawn(redrawn)
    lost = [name for name in ("changes.html",) if in_place and (folder / name).exists()]
    write_folder(out, files, overwrite=in_place or given["overwrite"])
    if given["as_json"]:
        click.echo(to_json(redrawn, out))
    else:
        click.echo("\n".join(describe(redrawn, out, lost)))
    return 0


def to_json(redrawn: Redrawn, out: Path) -> str:
    """Write what was redrawn, for machines."""
    document = {
        "out": str(out),
        "adjustments": redrawn.edition.adjustments,
        "moved": list(redrawn.moved),
        "names_placed_anew": list(redrawn.renamed),
        "names_without_place": list(redrawn.labelled.unplaced),
        "not_met": [f"{each.field}: {each.message}" for each in redrawn.unmet],
        "without_effect": list(redrawn.stale),
    }
    return json.dumps(document, ensure_ascii=False, indent=1)


def describe(redrawn: Redrawn, out: Path, lost: Sequence[str] = ()) -> list[str]:
    """Write what was redrawn, for people."""
    names = {s.id: s.name for s in redrawn.network.stations}
    moved = [f"{names[key]} ({key})" for key in redrawn.moved]
    placed = [f"{names[key]} ({key})" for key in redrawn.renamed]
    missing = redrawn.labelled.unplaced
    where = "edition.json has all places"
    return [
        f"Moved: {words.count(len(moved), 'station')}" if moved else "Moved: no station",
        *words.first_few(moved, everything=False, where=where),
        f"Names placed anew: {len(placed)}" if placed else "Names placed anew: none",
        *words.first_few(placed, everything=False, where=where),
        *([f"Names without a place: {', '.join(missing)}"] if missing else []),
        *(f"Not met: {each.field}: {each.message}" for each in redrawn.unmet),
        *(f"Without effect, and kept: {text}" for text in redrawn.stale),
        *(
            f"{name} told of the drawing before, and is gone: compare again with changes"
            for name in lost
        ),
        f"Written to {out}",
    ]
