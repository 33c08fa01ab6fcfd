"""The committed files are what the generator writes, and the generator's own check works."""

from __future__ import annotations

import io
import json
import os
import subprocess
import sys
import zipfile
import zlib
from pathlib import Path

import pytest
import shapely

from gtfs_schematic.demo.check import faults
from gtfs_schematic.demo.script import second_name
from gtfs_schematic.demo.write import write_demo

DATA = Path(__file__).parents[2] / "data"
FEEDS = ("after.zip", "before.zip")


def _members(content: bytes) -> list[tuple[str, tuple[int, ...], bytes]]:
    with zipfile.ZipFile(io.BytesIO(content)) as archive:
        return [(e.filename, e.date_time, archive.read(e)) for e in archive.infolist()]


def test_data_folder_holds_what_the_generator_writes(written: dict[str, bytes]):
    committed = {path.name: path.read_bytes() for path in DATA.iterdir()}
    del committed["README.md"], committed["demo-diagram.png"]
    assert committed.keys() == written.keys()
    for name in sorted(written.keys() - set(FEEDS)):
        assert committed[name] == written[name], name
    for name in FEEDS:
        assert _members(committed[name]) == _members(written[name]), name


@pytest.mark.skipif(
    "ng" in zlib.ZLIB_RUNTIME_VERSION, reason="zlib-ng packs the same tables into other bytes"
)
@pytest.mark.parametrize("name", FEEDS)
def test_committed_feed_is_the_written_one_byte_for_byte(name: str, written: dict[str, bytes]):
    assert (DATA / name).read_bytes() == written[name]


def test_another_process_with_another_hash_seed_writes_the_same(
    tmp_path: Path, written: dict[str, bytes]
):
    code = "import sys, pathlib as p; from gtfs_schematic.demo.write import write_demo as w; "
    code += "w(p.Path(sys.argv[1]))"
    for seed in ("1", "2"):
        environment = {**os.environ, "PYTHONHASHSEED": seed, "LC_ALL": "C", "TZ": "UTC-9"}
        folder = tmp_path / seed
        subprocess.run([sys.executable, "-c", code, str(folder)], check=True, env=environment)
    for name, content in written.items():
        assert (tmp_path / "1" / name).read_bytes() == (tmp_path / "2" / name).read_bytes()
        assert (tmp_path / "1" / name).read_bytes() == content


def test_write_demo_makes_the_folder_and_names_what_it_wrote(
    tmp_path: Path, written: dict[str, bytes]
):
    paths = write_demo(tmp_path / "new" / "demo")
    assert {path.name: path.read_bytes() for path in paths} == written


@pytest.mark.parametrize("name", FEEDS)
def test_feed_is_small(name: str):
    assert (DATA / name).stat().st_size < 400_000


def test_check_finds_no_fault(written: dict[str, bytes]):
    assert faults(written) == ()


def _spoiled(files: dict[str, bytes], table: str, old: str, new: str) -> dict[str, bytes]:
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w") as out:
        for name, _, content in _members(files["before.zip"]):
            text = content.decode()
            if name == table:
                assert old in text
                text = text.replace(old, new, 1)
            out.writestr(name, text)
    return {**files, "before.zip": buffer.getvalue()}


@pytest.mark.parametrize(
    ("table", "old", "new", "words"),
    [
        ("stop_times.txt", ",101-O1,", ",nowhere,", "'nowhere' is not in stops.txt"),
        ("stop_times.txt", "m1-K1,05:12", "m1-K1,04:12", "runs back in time"),
        ("stop_times.txt", ",101-O1,", ",101,", "101 is no stop or platform"),
        ("stops.txt", "122-E1,", "122-E2,", "stop_id not unique"),
        ("stops.txt", ",0,122,", ",0,301-1,", "is no station"),
        ("feed_info.txt", ",20260628,", ",20260728,", "begins before before.zip has ended"),
    ],
)
def test_check_finds_each_planted_fault(
    written: dict[str, bytes], table: str, old: str, new: str, words: str
):
    found = faults(_spoiled(written, table, old, new))
    assert any(words in fault for fault in found), found


def test_background_is_geojson_of_river_and_lake():
    # RFC 7946: lon before lat (3.1.1), outer ring closed and counterclockwise (3.1.6), no crs (4).
    collection = json.loads((DATA / "background.geojson").read_text(encoding="utf-8"))
    assert collection["type"] == "FeatureCollection"
    assert "crs" not in collection
    shapes = {
        feature["properties"]["kind"]: shapely.geometry.shape(feature["geometry"])
        for feature in collection["features"]
    }
    assert shapes.keys() == {"river", "lake"}
    lake, river = shapes["lake"], shapes["river"]
    assert lake.is_valid
    assert lake.exterior.is_ccw
    assert river.is_simple
    assert all(part.intersects(lake) for part in river.geoms)
    assert shapely.box(-20.3, -48.15, -19.7, -47.85).contains(shapely.union(lake, river))


def test_second_names_follow_the_spelling_rules():
    assert second_name("Únderbrisk") == "Ούνδερμπρισκ"
    assert second_name("Pradvelő-ur-Sulmé") == "Πραδβελώ-ουρ-Σουλμέ"  # noqa: RUF001 - Greek is meant
    assert second_name("Ás 12") == "Άς 12"
