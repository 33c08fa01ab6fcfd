"""Command `review`: look at an edition on a local web page."""

from __future__ import annotations

import contextlib
from pathlib import Path

import click

from gtfs_schematic.cli import options

_EPILOG = """\b
Example:
  gtfs-schematic review diagram
"""


@click.command(epilog=_EPILOG)
@options.edition
@click.option(
    "--port",
    type=click.IntRange(0, 65535),
    default=0,
    metavar="PORT",
    help="Port on this machine; 0 takes a free one.",
)
def review(edition: Path, port: int) -> None:
    """Show EDITION on a web page that only this machine can open, until Ctrl-C.

    EDITION is the folder that draw wrote.
    """
    from gtfs_schematic.review.page import page_of_folder
    from gtfs_schematic.review.serve import serving

    page = page_of_folder(edition)
    # Ctrl-C is how a look at a page ends, so it is no failure.
    with contextlib.suppress(KeyboardInterrupt), serving(page, port) as server:
        click.echo(f"http://127.0.0.1:{server.server_port}/")
        click.echo("Ctrl-C ends it.", err=True)
        server.serve_forever()
