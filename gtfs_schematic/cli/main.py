"""The command line: its commands, and what becomes of errors."""

from __future__ import annotations

import os
import sys
import traceback
from collections.abc import Sequence
from importlib.metadata import version

import click

from gtfs_schematic.cli.adjust import adjust
from gtfs_schematic.cli.changes import changes
from gtfs_schematic.cli.demo import demo
from gtfs_schematic.cli.draw import draw
from gtfs_schematic.cli.drift import drift
from gtfs_schematic.cli.editions import editions
from gtfs_schematic.cli.inspect import inspect
from gtfs_schematic.cli.review import review
from gtfs_schematic.cli.revise import revise
from gtfs_schematic.errors import SchematicError

_INTERRUPTED = 130
_TRACEBACK = "GTFS_SCHEMATIC_TRACEBACK"

_EPILOG = """\b
Exit codes:
  0  done
  1  a defect of this program
  2  wrong usage
  3  the input cannot be used (the message says why)
  4  done, but a limit that you set is exceeded

\b
Example:
  gtfs-schematic demo feeds
  gtfs-schematic draw feeds/before.zip --out spring
  gtfs-schematic revise spring feeds/after.zip --out summer
"""


@click.group(
    epilog=_EPILOG,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
)
@click.version_option(version("gtfs-schematic"), prog_name="gtfs-schematic")
def cli() -> None:
    """Draw transit network diagrams from GTFS feeds, and measure their drift from geography."""


for command in (inspect, draw, drift, revise, adjust, changes, editions, review, demo):
    cli.add_command(command)


def run(arguments: Sequence[str]) -> int:
    """Run one command and give its exit code; bad input never ends in a traceback.

    Parameters
    ----------
    arguments
        What stands behind the program's name.
    """
    try:
        code = cli.main(list(arguments), prog_name="gtfs-schematic", standalone_mode=False)
    except click.ClickException as error:
        error.show()
        return 2
    except SchematicError as error:
        click.echo(f"Error: {error}", err=True)
        return error.exit_code
    except BrokenPipeError:
        # The reader went away, as `head` does: be quiet, also when Python closes the stream.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except (Exception, KeyboardInterrupt) as error:  # noqa: BLE001 - the last resort, see `_broken`
        return _broken(error)
    return code if isinstance(code, int) else 0


def _broken(error: BaseException) -> int:
    """Say in one sentence that the user, or a defect, stopped the program."""
    # Ctrl-C within compiled code comes out wrapped in another error.
    causes = (error, error.__cause__, error.__context__)
    if any(isinstance(cause, KeyboardInterrupt | click.Abort) for cause in causes):
        click.echo("Stopped; nothing was written.", err=True)
        return _INTERRUPTED
    if os.environ.get(_TRACEBACK):
        traceback.print_exception(error)
    click.echo(
        f"Error: a defect of this program ({type(error).__name__}: {error}). Please report it "
        f"with the feed and what {_TRACEBACK}=1 shows.",
        err=True,
    )
    return 1


def main() -> None:
    """Run the command that was typed."""
    for stream in (sys.stdout, sys.stderr):
        # A terminal that lacks a character gets its escape instead of an error.
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")
    sys.exit(run(sys.argv[1:]))
