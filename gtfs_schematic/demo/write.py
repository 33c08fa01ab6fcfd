"""The demo files: two feeds, the truth about their differences, and the water around them."""

from __future__ import annotations

import csv
import io
import zipfile
from pathlib import Path

from gtfs_schematic.demo.changes import truth
from gtfs_schematic.demo.region import AFTER, BEFORE, Region
from gtfs_schematic.demo.stops import Row
from gtfs_schematic.demo.tables import feed_tables
from gtfs_schematic.demo.water import background

_EPOCH = (1980, 1, 1, 0, 0, 0)
"""The earliest time a zip entry can bear, so that the day of writing leaves no trace."""
_UNIX = 3
_MODE = 0o644 << 16


def _table(rows: list[Row]) -> bytes:
    text = io.StringIO()
    csv.writer(text, lineterminator="\n").writerows(rows)
    return text.getvalue().encode()


def _feed(region: Region) -> bytes:
    archive = io.BytesIO()
    with zipfile.ZipFile(archive, "w") as out:
        for name, rows in sorted(feed_tables(region).items()):
            entry = zipfile.ZipInfo(name, _EPOCH)
            entry.create_system, entry.external_attr = _UNIX, _MODE
            out.writestr(entry, _table(rows), zipfile.ZIP_DEFLATED, 9)
    return archive.getvalue()


def demo_files() -> dict[str, bytes]:
    """Give the demo files by name: the same bytes on every call.

    The tables in the feeds are the same everywhere; how tightly they are packed is up to the
    zlib at hand.
    """
    return {
        "after.zip": _feed(AFTER),
        "background.geojson": background(),
        "before.zip": _feed(BEFORE),
        "changes-truth.json": truth(),
    }


def write_demo(folder: Path) -> tuple[Path, ...]:
    """Write the demo files into a folder, made if missing, and give their paths."""
    folder.mkdir(parents=True, exist_ok=True)
    paths = []
    for name, content in demo_files().items():
        path = folder / name
        path.write_bytes(content)
        paths.append(path)
    return tuple(paths)
