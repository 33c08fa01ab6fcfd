"""Finding the files of a feed in a zip or a folder, and refusing what is unsafe to read."""

from __future__ import annotations

import io
import os
import re
import stat
import zipfile
import zlib
from collections import defaultdict
from collections.abc import Callable, Iterable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path, PurePosixPath
from typing import cast

from gtfs_schematic.errors import FeedError

CORE_FILES = ("agency.txt", "routes.txt", "stop_times.txt", "stops.txt", "trips.txt")
"""Files that every feed must have (GTFS Schedule reference, "Dataset Files")."""

_TELLING = 2  # core files that make a folder a candidate: enough to tell, few enough to report
_MAX_DEPTH = 4
_MAX_MEMBERS = 10_000
_MAX_TOTAL_BYTES = 16 * 2**30  # far above the largest national feed
_MAX_RATIO = 200  # timetables shrink to a tenth or a fiftieth; deflate can reach 1:1032
_RATIO_FREE_BYTES = 32 * 2**20  # small files may shrink as they like: they do no harm
_BUFFER = 1 << 18
_DAMAGE = (
    zipfile.BadZipFile,
    zlib.error,
    EOFError,
    OSError,
    NotImplementedError,
    RuntimeError,
)


@dataclass(frozen=True)
class FeedFiles:
    """The files of one feed, by their bare names; see `open_feed`."""

    label: str
    """Name of the zip or folder, for messages."""
    folder: str
    """Folder inside the zip or folder that holds the files; "" if they are at the root."""
    names: tuple[str, ...]
    ignored_folders: tuple[str, ...]
    """Other folders that look like feeds too."""
    _opener: Callable[[str], io.BufferedReader]

    @contextmanager
    def open(self, name: str) -> Iterator[io.BufferedReader]:
        """Open a file for reading bytes; damage found while reading becomes a `FeedError`."""
        try:
            with self._opener(name) as stream:
                yield stream
        except _DAMAGE as error:
            raise FeedError(
                f"cannot be read ({error}). The feed is damaged or was cut short: "
                "fetch it again and check it with another archive program.",
                file=name,
            ) from error


@contextmanager
def open_feed(path: Path) -> Iterator[FeedFiles]:
    """Open the feed at `path`, a zip or a folder, whose tables may lie in one nested folder.

    Raises
    ------
    FeedError
        Nothing there; no feed, or several, inside; a zip that is damaged, encrypted, leads
        outside itself or unpacks to an unreasonable size.
    """
    label = path.name or str(path)
    if path.is_dir():
        found = {name: path / name for name in _walk(path)}
        yield _pick(label, found, lambda member: found[member].open("rb"))
        return
    if not path.exists():
        raise FeedError(f"There is no file or folder {str(path)!r}. Check the path.")
    if not path.is_file():
        raise FeedError(
            f"{str(path)!r} is neither a file nor a folder. Give a GTFS zip or a folder."
        )
    try:
        archive = zipfile.ZipFile(path)
    except (zipfile.BadZipFile, OSError, NotImplementedError) as error:
        raise FeedError(
            f"{label} is not a readable zip ({error}). Give a GTFS zip, or the folder that "
            "holds its .txt files."
        ) from error
    with archive:
        members = _safe_members(label, archive)
        yield _pick(label, members, lambda name: _buffered(archive, members[name]))


def _buffered(archive: zipfile.ZipFile, member: zipfile.ZipInfo) -> io.BufferedReader:
    # A ZipExtFile reads like a raw stream, but is typed as a buffered one.
    return io.BufferedReader(cast("io.RawIOBase", archive.open(member)), _BUFFER)


def _walk(root: Path) -> list[str]:
    """List files below a folder, as paths with "/", without following links to folders.

    What is no file to read, such as a pipe or a device, is left out: it might never end.
    """
    found = []
    for folder, folders, files in os.walk(root):
        relative = Path(folder).relative_to(root)
        folders[:] = sorted(folders) if len(relative.parts) < _MAX_DEPTH else []
        found += [(relative / file).as_posix() for file in files if Path(folder, file).is_file()]
    return sorted(found)


def _safe_members(label: str, archive: zipfile.ZipFile) -> dict[str, zipfile.ZipInfo]:
    """Give the zip's files by name, or refuse the zip whole."""
    infos = [info for info in archive.infolist() if not info.is_dir()]
    if len(infos) > _MAX_MEMBERS:
        raise FeedError(f"{label} holds {len(infos)} files; a feed has a few dozen.")
    members: dict[str, zipfile.ZipInfo] = {}
    total = 0
    for info in infos:
        fault = _member_fault(info)
        if info.filename in members:
            fault = "is in the zip twice, so it is not clear which one holds"
        total += info.file_size
        if total > _MAX_TOTAL_BYTES:
            fault = f"takes the zip's unpacked size past {_MAX_TOTAL_BYTES // 2**30} GiB"
        if fault:
            raise FeedError(f"{label} is refused: {info.filename!r} {fault}.")
        members[info.filename] = info
    return members


def _member_fault(info: zipfile.ZipInfo) -> str:
    """Say what makes a zip member unsafe; "" if nothing."""
    name = info.filename
    if (
        name.startswith("/")
        or "\\" in info.orig_filename
        or re.match(r"[A-Za-z]:", name)
        or ".." in PurePosixPath(name).parts
    ):
        return "leads outside the zip"
    if stat.S_ISLNK(info.external_attr >> 16):
        return "is a link, not a file"
    if info.flag_bits & 0x1:
        return "is encrypted; give an unprotected zip"
    if info.file_size > _RATIO_FREE_BYTES and info.file_size > _MAX_RATIO * info.compress_size:
        return f"unpacks to more than {_MAX_RATIO} times its packed size, which no timetable does"
    return ""


def _pick(
    label: str, found: Iterable[str], opener: Callable[[str], io.BufferedReader]
) -> FeedFiles:
    """Choose the one folder that holds the feed."""
    folders: Mapping[str, list[str]] = _by_folder(found)
    candidates = [
        folder
        for folder, names in folders.items()
        if sum(name.lower() in CORE_FILES for name in names) >= _TELLING
    ]
    if not candidates:
        zips = [name for name in found if name.lower().endswith(".zip")]
        hint = (
            f"It holds other zips ({', '.join(zips[:5])}): give one of those by its own path."
            if zips
            else f"A feed has at least {', '.join(CORE_FILES)}."
        )
        raise FeedError(f"{label} holds no GTFS feed. {hint}")
    if "" in candidates:  # the reference wants the files at the root, so there they count
        folder, others = "", tuple(candidates[1:])
    elif len(candidates) == 1:
        folder, others = candidates[0], ()
    else:
        raise FeedError(
            f"{label} holds several feeds, in the folders {', '.join(candidates)}. "
            "Unpack it and give the folder of one of them, or give several paths."
        )
    return FeedFiles(
        label,
        folder,
        tuple(folders[folder]),
        others,
        lambda name: opener(f"{folder}/{name}" if folder else name),
    )


def _by_folder(found: Iterable[str]) -> dict[str, list[str]]:
    """Sort file names into folders; what operating systems leave behind is skipped."""
    folders: defaultdict[str, list[str]] = defaultdict(list)
    for name in sorted(found):
        *parents, bare = name.split("/")
        if "__MACOSX" in parents or bare.startswith("."):
            continue
        folders["/".join(parents)].append(bare)
    return dict(sorted(folders.items()))
