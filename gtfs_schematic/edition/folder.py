"""Write an edition's files into one folder, all or nothing, and load an edition from disk."""

from __future__ import annotations

import contextlib
import hashlib
import os
import shutil
import tempfile
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from gtfs_schematic.edition.exchange import exchanged
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.edition.save import from_json
from gtfs_schematic.errors import EditionError, SchematicError, UsageError

if TYPE_CHECKING:
    from gtfs_schematic.edition.state import State

StrPath = str | os.PathLike[str]

EDITION_FILE = "edition.json"
STATE_FILE = "state.json"
"""What redrawing without the feed needs; editions of earlier versions have none."""

FILES = (
    "diagram.svg",
    "diagram.pdf",
    "diagram.txt",
    EDITION_FILE,
    STATE_FILE,
    "drift.json",
    "drift.csv",
    "drift.html",
)
"""What an edition's folder holds."""

FILES_IF_WANTED = (
    "diagram.png",
    "changes.html",
    "changes.pdf",
    "changes.csv",
    "changes.json",
)
"""What it may hold beside, and nothing else."""


def write_folder(folder: StrPath, files: Mapping[str, bytes], *, overwrite: bool = False) -> None:
    """Write files into a folder that then holds just them.

    1. Everything is first written into a hidden folder beside the wanted one.
    2. A finished folder takes the place of the old one by renaming; a failure leaves the old.
       Where the system can exchange two folders in one step, no moment is without an edition.

    Parameters
    ----------
    folder
        Where to; folders above it are made.
    files
        Contents by file name.
    overwrite
        Whether an edition that stands there may be replaced. Anything else never is.

    Raises
    ------
    UsageError
        If the folder must not be replaced.
    EditionError
        If the disk refuses.
    """
    check_target(Path(folder), overwrite=overwrite)
    target = Path(os.path.realpath(folder))
    try:
        target.parent.mkdir(parents=True, exist_ok=True)
        fresh = Path(tempfile.mkdtemp(prefix=f".{target.name}-", dir=target.parent))
        try:
            for name in sorted(files):
                (fresh / name).write_bytes(files[name])
            # A folder from mkdtemp is for its owner alone; give it the usual rights.
            fresh.chmod(0o777 & ~_umask())
            _replace(fresh, target)
        finally:
            shutil.rmtree(fresh, ignore_errors=True)
    except OSError as error:
        raise EditionError(
            f"{folder}: cannot write the edition ({error.strerror or error}). "
            "Choose another folder with --out, or make room."
        ) from error


def check_target(folder: Path, *, overwrite: bool) -> None:
    """Refuse a folder that must not be replaced, before any work is done.

    Raises
    ------
    UsageError
        If it cannot be made, or is a file, or a folder that is not empty and not an edition, or
        an edition that may not be overwritten.
    """
    above = next(part for part in (folder.absolute(), *folder.absolute().parents) if part.exists())
    if above != folder.absolute():
        if not (above.is_dir() and os.access(above, os.W_OK)):
            raise UsageError(
                f"{folder}: cannot be made in {above}. Choose another folder with --out."
            )
        return
    if not folder.is_dir():
        raise UsageError(f"{folder}: a file stands there. Choose another folder with --out.")
    names = sorted(entry.name for entry in folder.iterdir())
    if not names:
        return
    strange = [name for name in names if name not in FILES + FILES_IF_WANTED]
    if strange or EDITION_FILE not in names or not _is_edition(folder):
        found = f"it holds {strange[0]!r}" if strange else f"it holds no readable {EDITION_FILE}"
        raise UsageError(
            f"{folder}: not a folder that draw wrote ({found}), so it is left alone. "
            "Choose another folder with --out."
        )
    if not overwrite:
        raise UsageError(
            f"{folder}: an edition stands there already. "
            "Give --overwrite to replace it, or choose another folder with --out."
        )


def load_edition(path: StrPath) -> Edition:
    """Load an edition from its folder or its `edition.json`.

    Raises
    ------
    EditionError
        If there is none, or it cannot be read.
    """
    file = Path(path)
    if file.is_dir():
        file /= EDITION_FILE
    try:
        data = file.read_bytes()
    except OSError as error:
        raise EditionError(
            f"{file}: cannot read the edition ({error.strerror or error}). "
            f"Give the folder that draw wrote, or its {EDITION_FILE}."
        ) from error
    try:
        return from_json(data)
    except EditionError as error:
        raise EditionError(f"{file}: {str(error).removeprefix('edition.json: ')}") from error


@dataclass(frozen=True, slots=True)
class Beside:
    """What the folder of an edition says of it."""

    sha256: str = ""
    """Of its `edition.json`, by which the next one names it; empty: unknown."""
    state: State | None = None
    """With it, what was merged, split and hidden is known again whatever became of the ids."""


def load_beside(path: StrPath, edition: Edition) -> Beside:
    """Load hash and state of an edition that was loaded from a folder or its `edition.json`.

    Raises
    ------
    EditionError
        As `load_state` and `digest_of_edition` do.
    """
    return Beside(digest_of_edition(path), load_state(path, edition))


def load_state(path: StrPath, edition: Edition) -> State | None:
    """Load what is kept beside an edition for redrawing it; None if nothing is.

    Parameters
    ----------
    path
        The folder or its `edition.json`.
    edition
        What stands there.

    Raises
    ------
    EditionError
        If it cannot be read, or is another edition's.
    """
    if not edition.state_sha256:
        return None
    from gtfs_schematic.edition.state import from_json as state_from_json  # noqa: PLC0415 - slow

    file = Path(path)
    file = (file if file.is_dir() else file.parent) / STATE_FILE
    try:
        return state_from_json(file.read_bytes(), edition)
    except FileNotFoundError:
        return None
    except OSError as error:
        raise EditionError(f"{file}: cannot be read ({error.strerror or error}).") from error


def digest_of_edition(path: StrPath) -> str:
    """Give the SHA-256 of an edition's `edition.json`, by which the next names it.

    Raises
    ------
    EditionError
        If it cannot be read.
    """
    file = Path(path)
    if file.is_dir():
        file /= EDITION_FILE
    try:
        return hashlib.sha256(file.read_bytes()).hexdigest()
    except OSError as error:
        raise EditionError(
            f"{file}: cannot read the edition ({error.strerror or error})."
        ) from error


def _is_edition(folder: Path) -> bool:
    try:
        load_edition(folder)
    except SchematicError:
        return False
    return True


def _replace(fresh: Path, target: Path) -> None:
    """Rename `fresh` to `target`; an old folder comes back if that fails."""
    if not target.exists():
        fresh.rename(target)
        return
    if exchanged(fresh, target):
        # What stood there is in `fresh` now, which the caller clears away.
        return
    aside = Path(tempfile.mkdtemp(prefix=f".{target.name}-old-", dir=target.parent))
    old = aside / target.name
    try:
        target.rename(old)
        try:
            fresh.rename(target)
        except OSError:
            old.rename(target)
            raise
    finally:
        with contextlib.suppress(OSError):
            if target.exists():
                shutil.rmtree(aside)


def _umask() -> int:
    """Read the process's file creation mask, which can only be read by setting it."""
    mask = os.umask(0o022)
    os.umask(mask)
    return mask
