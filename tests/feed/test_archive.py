"""Finding the feed in a zip or folder, and refusing what is unsafe."""

from __future__ import annotations

import os
import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest

from gtfs_schematic.errors import FeedError
from gtfs_schematic.feed.archive import open_feed
from gtfs_schematic.feed.model import FeedSettings
from gtfs_schematic.feed.read import read_feed

CORE = ("agency.txt", "routes.txt", "stop_times.txt", "stops.txt", "trips.txt")


@pytest.fixture
def pack(tmp_path: Path) -> Callable[..., Path]:
    def write(names: dict[str, str | bytes]) -> Path:
        path = tmp_path / "feed.zip"
        with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
            for name, content in names.items():
                archive.writestr(name, content)
        return path

    return write


def test_files_in_a_nested_folder_are_found_and_junk_is_skipped(pack):
    junk = {"__MACOSX/in/er/._stops.txt": "x", "in/er/.DS_Store": "x", "in/er/more/ok.txt": "x"}
    path = pack({f"in/er/{name}": f"text of {name}" for name in CORE} | junk)
    with open_feed(path) as files:
        assert files.folder == "in/er"
        assert files.names == CORE
        with files.open("stops.txt") as stream:
            assert stream.read() == b"text of stops.txt"


def test_a_folder_reads_as_its_zip_does(town, tmp_path):
    path = town()
    with zipfile.ZipFile(path) as archive:
        archive.extractall(tmp_path / "unpacked" / "deep")
    zipped, unpacked = (
        read_feed([place], FeedSettings()) for place in (path, tmp_path / "unpacked")
    )
    assert zipped.info.sha256 == unpacked.info.sha256
    assert zipped.patterns == unpacked.patterns
    assert [f.message for f in unpacked.findings] == [
        "the files are in a folder inside the zip or folder, not at its root"
    ]


def test_two_nested_feeds_are_refused_and_both_named(pack):
    path = pack({f"{folder}/{name}": "" for folder in ("west", "east") for name in CORE})
    with pytest.raises(FeedError, match="in the folders east, west"), open_feed(path):
        pass


def test_files_at_the_root_count_and_a_feed_below_is_told(town, tmp_path):
    path = town()
    with zipfile.ZipFile(path, "a") as archive:
        for name in CORE:
            archive.writestr(f"old/{name}", "")
    timetable = read_feed([path], FeedSettings())
    assert [(f.severity, f.file) for f in timetable.findings] == [("warning", "old")]


@pytest.mark.parametrize(
    ("name", "told"),
    [
        ("../stops.txt", "leads outside"),
        ("/etc/stops.txt", "leads outside"),
        ("C:/stops.txt", "leads outside"),
        ("a\\..\\stops.txt", "leads outside"),
        ("a/../../stops.txt", "leads outside"),
    ],
)
def test_names_that_lead_outside_are_refused(pack, name, told):
    path = pack({name: "x"} | dict.fromkeys(CORE, "x"))
    with pytest.raises(FeedError, match=told), open_feed(path):
        pass


def test_a_link_in_a_zip_is_refused(tmp_path):
    path = tmp_path / "link.zip"
    with zipfile.ZipFile(path, "w") as archive:
        info = zipfile.ZipInfo("stops.txt")
        info.create_system = 3
        info.external_attr = 0o120777 << 16
        archive.writestr(info, "/etc/passwd")
    with pytest.raises(FeedError, match="is a link"), open_feed(path):
        pass


def test_a_zip_bomb_is_refused_without_unpacking_it(pack):
    path = pack(dict.fromkeys(CORE, "x") | {"shapes.txt": bytes(64 * 2**20)})
    assert path.stat().st_size < 2**20
    with pytest.raises(FeedError, match=r"'shapes.txt' unpacks to more than 200 times"):
        read_feed([path], FeedSettings())


def test_a_name_that_is_there_twice_is_refused(tmp_path):
    path = tmp_path / "twice.zip"
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr("stops.txt", "x")
        with pytest.warns(UserWarning, match="Duplicate name"):
            archive.writestr("stops.txt", "y")
    with pytest.raises(FeedError, match="twice"), open_feed(path):
        pass


def test_an_encrypted_member_is_refused(pack):
    path = pack(dict.fromkeys(CORE, "x"))
    raw = bytearray(path.read_bytes())
    raw[raw.index(b"PK\x01\x02") + 8] |= 1  # the flag in the central directory, APPNOTE 4.4.4
    path.write_bytes(raw)
    with pytest.raises(FeedError, match="encrypted"), open_feed(path):
        pass


def test_damage_inside_a_zip_is_told_with_the_file(town, table):
    path = town({"stops.txt": table("stops.txt") + "x" * 5000})
    raw = bytearray(path.read_bytes())
    start = raw.index(b"stops.txt") + len("stops.txt")
    raw[start + 40 : start + 60] = bytes(20)
    path.write_bytes(raw)
    with pytest.raises(FeedError, match=r"stops.txt: cannot be read .* damaged"):
        read_feed([path], FeedSettings())


@pytest.mark.parametrize(
    ("content", "told"),
    [(b"stop_id,stop_name\n", "not a readable zip"), (b"", "not a readable zip")],
)
def test_what_is_no_zip_is_refused(tmp_path, content, told):
    path = tmp_path / "stops.txt"
    path.write_bytes(content)
    with pytest.raises(FeedError, match=told), open_feed(path):
        pass


def test_no_path_no_feed_and_zips_in_a_zip_are_told_apart(tmp_path, pack):
    with pytest.raises(FeedError, match="no file or folder"), open_feed(tmp_path / "none.zip"):
        pass
    with pytest.raises(FeedError, match="holds no GTFS feed"), open_feed(pack({"a.txt": "x"})):
        pass
    zips = pack({"in/bus.zip": "x"})
    with pytest.raises(FeedError, match=r"other zips \(in/bus.zip\)"), open_feed(zips):
        pass


def test_pipes_are_no_files_and_nobody_waits_for_them(town_files, tmp_path):
    for name, text in town_files.items():
        (tmp_path / name).write_text(text, "utf-8")
    os.mkfifo(tmp_path / "levels.txt")
    assert read_feed([tmp_path], FeedSettings()).patterns
    with pytest.raises(FeedError, match="neither a file nor a folder"):
        read_feed([tmp_path / "levels.txt"], FeedSettings())
