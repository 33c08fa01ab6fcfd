"""List the editions of a folder, each after the one that it revises, and go back to one."""

from __future__ import annotations

import os
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from gtfs_schematic.edition.folder import (
    EDITION_FILE,
    FILES,
    FILES_IF_WANTED,
    digest_of_edition,
    load_edition,
)
from gtfs_schematic.edition.save import from_json, to_json
from gtfs_schematic.errors import EditionError, UsageError


@dataclass(frozen=True, slots=True)
class Listed:
    """An edition in a folder of editions."""

    name: str
    """Name of its folder."""
    sha256: str
    """Of its `edition.json`."""
    previous: str
    """Hash of the edition that it revises; empty for a first one."""
    previous_name: str
    """Name of that edition's folder; empty if it is not in this folder."""
    title: str
    feed_version: str
    start_date: str
    end_date: str
    stations: int
    lines: int


def editions_in(folder: Path) -> tuple[tuple[Listed, ...], tuple[str, ...]]:
    """List the editions in the folders of a folder.

    Returns
    -------
    tuple
        The editions, each after the one that it revises and otherwise by date and name; and what
        is wrong with those that cannot be read.

    Raises
    ------
    UsageError
        If there is no such folder.
    """
    if not folder.is_dir():
        raise UsageError(f"{folder}: no folder. Name the folder that holds editions.")
    found: list[Listed] = []
    faults: list[str] = []
    for file in sorted(folder.glob(f"*/{EDITION_FILE}")):
        # A hidden folder is a write that was interrupted, or has not ended.
        if file.parent.name.startswith("."):
            continue
        try:
            found.append(_listed(file))
        except EditionError as error:
            faults.append(str(error))
    return _in_order(found), tuple(faults)


def latest(listed: Sequence[Listed]) -> Listed:
    """Give the edition that none revises, the last of them in order if they are several."""
    revised = {each.previous for each in listed}
    return [each for each in listed if each.sha256 not in revised][-1]


def gone_back_to(folder: Path, name: str) -> tuple[dict[str, bytes], Listed]:
    """Give the files of an edition like an earlier one, that follows the latest of a folder.

    Nothing is taken away: the editions in between stay, and so does the way to them.

    Parameters
    ----------
    folder
        Of editions.
    name
        Folder name of the earlier one.

    Returns
    -------
    tuple
        Its files by name, without a change sheet, and the latest edition, which it names as the
        one before.

    Raises
    ------
    UsageError
        If there is no such edition, or it is the latest.
    EditionError
        If it cannot be read.
    """
    listed, faults = editions_in(folder)
    names = {each.name: each for each in listed}
    if name not in names:
        broken = next((fault for fault in faults if f"{folder / name}{os.sep}" in fault), None)
        if broken:
            raise EditionError(broken)
        known = ", ".join(names) or "none"
        raise UsageError(f"{folder / name}: no edition. Editions there: {known}.")
    last = latest(listed)
    if last.name == name:
        raise UsageError(f"{folder / name} is the latest edition of the folder already.")
    source = folder / name
    try:
        files = {
            file: (source / file).read_bytes()
            for file in (*FILES, *FILES_IF_WANTED)
            if (source / file).is_file() and not file.startswith("changes.")
        }
    except OSError as error:
        raise EditionError(f"{source}: cannot be read ({error.strerror or error}).") from error
    edition = replace(from_json(files[EDITION_FILE]), previous=last.sha256)
    return files | {EDITION_FILE: to_json(edition)}, last


def _listed(file: Path) -> Listed:
    edition = load_edition(file)
    return Listed(
        name=file.parent.name,
        sha256=digest_of_edition(file),
        previous=edition.previous,
        previous_name="",
        title=edition.title,
        feed_version=edition.feed.version,
        start_date=edition.feed.start_date,
        end_date=edition.feed.end_date,
        stations=len(edition.stations),
        lines=len(edition.lines),
    )


def _in_order(found: Iterable[Listed]) -> tuple[Listed, ...]:
    """Put each edition after the one that it revises."""
    waiting = sorted(found, key=lambda each: (each.start_date, each.name))
    names = {each.sha256: each.name for each in waiting}
    placed: dict[str, Listed] = {}
    while waiting:
        ready = [e for e in waiting if e.previous not in names or names[e.previous] in placed]
        # A hash cannot name itself, so some edition is always ready; the rest is for safety.
        each = (ready or waiting)[0]
        waiting.remove(each)
        placed[each.name] = Listed(
            each.name, each.sha256, each.previous, names.get(each.previous, ""), each.title,
            each.feed_version, each.start_date, each.end_date, each.stations, each.lines,
        )  # fmt: skip
    return tuple(placed.values())
