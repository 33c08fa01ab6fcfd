"""Command `demo`: write the demo feeds."""

from __future__ import annotations

from pathlib import Path

import click

from gtfs_schematic.cli import options
from gtfs_schematic.errors import UsageError

_EPILOG = """\b
Example:
  gtfs-schematic demo feeds
  gtfs-schematic draw feeds/before.zip --out diagram
"""


@click.command(epilog=_EPILOG)
@click.argument("folder", metavar="DIR", type=click.Path(path_type=Path))
@options.overwrite
def demo(folder: Path, *, overwrite: bool) -> None:
    """Write the demo feeds of an invented region, before and after a service change, into DIR."""
    from gtfs_schematic.demo.write import demo_files

    files = demo_files()
    try:
        folder.mkdir(parents=True, exist_ok=True)
        there = [name for name in sorted(files) if (folder / name).exists()]
        if there and not overwrite:
            raise UsageError(
                f"{folder / there[0]}: exists already. Give --overwrite to replace it, or choose "
                "another folder."
            )
        for name in sorted(files):
            (folder / name).write_bytes(files[name])
    except OSError as error:
        raise UsageError(
            f"{folder}: cannot write the demo feeds ({error.strerror or error}). "
            "Choose another folder."
        ) from error
    click.echo("\n".join(str(folder / name) for name in sorted(files)))
