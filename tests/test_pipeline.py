"""The whole way from the demo feed to its files, and that it is the same every time."""

from __future__ import annotations

import csv
import hashlib
import importlib.resources
import io
import json
import os
import random
import re
import subprocess
import sys
import zipfile
from dataclasses import replace
from pathlib import Path
from types import SimpleNamespace
from xml.etree import ElementTree as ET

import jsonschema
import pypdf
import pytest

from gtfs_schematic import pipeline
from gtfs_schematic.config import settings_of
from gtfs_schematic.drift.limits import parse_limit
from gtfs_schematic.edition.folder import FILES, load_edition, write_folder
from gtfs_schematic.edition.save import from_json
from gtfs_schematic.errors import InternalFaultError, LayoutError
from gtfs_schematic.labels.model import LabelledLayout
from gtfs_schematic.layout.model import NameRoom
from gtfs_schematic.progress import Silent

ROOT = Path(__file__).parent.parent
BEFORE = ROOT / "data" / "before.zip"
QUICK = settings_of({"layout": {"effort": "quick"}}, "test")
TRAMS = settings_of({"layout": {"effort": "quick"}, "feed": {"modes": ["tram"]}}, "test")
SVG = "{http://www.w3.org/2000/svg}"


@pytest.fixture(scope="module")
def result():
    return pipeline.draw(BEFORE, QUICK)


@pytest.fixture(scope="module")
def files(result):
    return pipeline.files_of(result)


def test_the_files_are_those_of_an_edition(files):
    assert tuple(sorted(files)) == tuple(sorted(FILES))


def test_every_stage_is_of_the_same_network(result):
    assert result.layout.network == result.network
    assert result.bundled is result.labelled.bundled
    assert {s.station_id for s in result.drift.stations} == set(result.network.station)
    assert result.labelled.unplaced == ()


def test_edition_and_drift_meet_their_schemas(files):
    for room, name in (("edition", "edition"), ("drift", "drift")):
        home = importlib.resources.files(f"gtfs_schematic.{room}")
        schema = json.loads((home / f"{name}.schema.json").read_text("utf-8"))
        jsonschema.validate(json.loads(files[f"{name}.json"]), schema)


def test_the_edition_says_what_the_diagram_shows(result, files):
    edition = from_json(files["edition.json"])
    assert edition == result.edition
    root = ET.fromstring(files["diagram.svg"])
    assert root.get("viewBox") == f"0 0 {edition.width_mm:g} {edition.height_mm:g}"
    groups = list(root.iter(f"{SVG}g"))
    drawn = {g.get("data-station"): g for g in groups if g.get("class") == "station"}
    assert set(drawn) == {station.id for station in edition.stations}
    lines = {g.get("data-line") for g in groups if g.get("class") == "line"}
    assert lines == {line.id for line in edition.lines}
    for station in edition.stations:
        name = "".join(
            "".join(t.itertext())
            for t in drawn[station.id].iter(f"{SVG}text")
            if t.get("class") == "station-name"
        )
        assert re.sub(r"\W", "", station.name) == re.sub(r"\W", "", name)


def test_the_pdf_has_the_page_and_the_names(result, files):
    page = pypdf.PdfReader(io.BytesIO(files["diagram.pdf"])).pages[0]
    width, height = (float(side) * 25.4 / 72 for side in page.mediabox.upper_right)
    assert (width, height) == pytest.approx(
        (result.edition.width_mm, result.edition.height_mm), abs=0.01
    )
    text = re.sub(r"\W", "", page.extract_text())
    for station in result.edition.stations:
        assert re.sub(r"\W", "", station.name) in text


def test_every_stop_of_the_feed_is_drawn_or_left_out(result):
    """Counted in the feed itself, by csv alone."""
    with zipfile.ZipFile(BEFORE) as archive:
        rows = csv.DictReader(io.StringIO(archive.read("stop_times.txt").decode("utf-8-sig")))
        called = {row["stop_id"] for row in rows}
    drawn = {key for station in result.edition.stations for key in station.stop_ids}
    left_out = {key for kind, key, _ in result.edition.left_out if kind in {"stop", "station"}}
    assert called <= drawn | left_out


def test_limits_go_into_the_drift_files(result):
    files = pipeline.files_of(result, [parse_limit("residual=1e-6"), parse_limit("residual=1")])
    assert [each["exceeded"] for each in json.loads(files["drift.json"])["limits"]] == [True, False]
    assert b"exceeded" in files["drift.html"]


OLD_MACHINE = {
    "OPENBLAS_CORETYPE": "Nehalem",
    "OPENBLAS_NUM_THREADS": "1",
    "NPY_DISABLE_CPU_FEATURES": "AVX512F AVX512CD AVX512_SKX AVX2 FMA3 F16C",
    "GLIBC_TUNABLES": "glibc.cpu.hwcaps=-AVX2,-FMA,-AVX512F",
    "NUMBA_CPU_NAME": "generic",
}
"""Makes BLAS, numpy, libm and numba compute as on a processor without their fast instructions."""


def run_draw(out: Path, **environment: str) -> dict[str, str]:
    """Draw in a process of its own, and give the digest of every file."""
    command = [sys.executable, "-m", "gtfs_schematic", "draw", str(BEFORE), "--effort", "quick"]
    command += ["--out", str(out), "--quiet"]
    subprocess.run(command, check=True, capture_output=True, env=os.environ | environment)
    return digests({file.name: file.read_bytes() for file in out.iterdir()})


def digests(files: dict[str, bytes]) -> dict[str, str]:
    return {name: hashlib.sha256(data).hexdigest() for name, data in sorted(files.items())}


def test_same_bytes_under_any_hash_seed_locale_and_processor(files, tmp_path):
    """Three processes: this one, and two that differ in all that must not matter."""
    first = run_draw(tmp_path / "a", PYTHONHASHSEED="1", LC_ALL="C", TZ="Pacific/Auckland")
    old = OLD_MACHINE | {"NUMBA_CACHE_DIR": str(tmp_path / "numba")}
    second = run_draw(tmp_path / "b", PYTHONHASHSEED="4242", LC_ALL="C.UTF-8", TZ="UTC", **old)
    assert first == second == digests(files)


@pytest.mark.parametrize("seed", [1, 2])
def test_shuffled_rows_give_the_same_picture(seed, tmp_path):
    """Order of rows means nothing in GTFS, but for row numbers in findings."""
    shuffled = tmp_path / "shuffled.zip"
    rng = random.Random(seed)  # noqa: S311 - no secret
    with zipfile.ZipFile(BEFORE) as old, zipfile.ZipFile(shuffled, "w") as new:
        for name in sorted(old.namelist(), reverse=True):
            head, *rows = old.read(name).decode("utf-8-sig").splitlines(keepends=True)
            rng.shuffle(rows)
            new.writestr(name, head + "".join(rows))
    one, two = (pipeline.draw(feed, TRAMS) for feed in (BEFORE, shuffled))
    assert two.labelled.labels == one.labelled.labels
    assert two.drawing == one.drawing
    assert two.edition.stations == one.edition.stations


def test_a_fault_stops_the_run(monkeypatch):
    monkeypatch.setattr("gtfs_schematic.layout.check.faults", lambda *_: ("bent", "crossed"))
    with pytest.raises(InternalFaultError, match=r"layout stage found 2 faults") as caught:
        pipeline.draw(BEFORE, TRAMS)
    assert "  - bent\n  - crossed" in str(caught.value)


class Rounds:
    """Stands in for layout, bundles and labels, and keeps count of what they were asked."""

    def __init__(self, unplaced: list[int | None], result: pipeline.Result) -> None:
        self.unplaced, self.result = unplaced, result
        self.asked: list[tuple[NameRoom, ...]] = []
        self.widened: list[bool] = []

    def fit(self, *_: object, **__: object) -> object:
        """Refuse where the list says None."""
        if self.unplaced[0] is None:
            raise LayoutError("no room")
        return SimpleNamespace(layout=self.result.layout)

    def refit(self, fitted: object, rooms: tuple[NameRoom, ...], **_: object) -> object:
        """Keep what was asked for."""
        self.asked.append(rooms)
        return fitted

    def place_labels(self, *_: object, widen: bool, **__: object) -> LabelledLayout:
        """Leave as many names out as the list says."""
        missing = self.unplaced[len(self.widened)]
        self.widened.append(widen)
        ids = tuple(station.id for station in self.result.network.stations[:missing])
        return replace(self.result.labelled, unplaced=ids)

    def wishes(
        self, labelled: LabelledLayout, before: tuple[NameRoom, ...]
    ) -> tuple[NameRoom, ...]:
        """Ask for the names without a place, told what was asked before."""
        assert before == tuple(room for asked in self.asked for room in asked)
        return tuple(NameRoom(key, (), stands=False) for key in labelled.unplaced)


@pytest.mark.parametrize(
    ("unplaced", "left", "rounds"),
    [
        ([0], 0, 1),
        ([3, 0], 0, 2),
        ([3, 2, 1, 1, 0], 1, 4),
        ([3, 3, 3, 3], 3, 4),
        ([2, 5, 2, 4], 2, 4),
        ([3, 3, 1, 0], 0, 4),
    ],
)
def test_room_is_asked_for_while_it_helps(unplaced, left, rounds, result, monkeypatch):
    stand_in = Rounds(unplaced, result)
    monkeypatch.setattr(
        pipeline, "place", lambda network, *_, **__: SimpleNamespace(network=network)
    )
    monkeypatch.setattr(pipeline, "fit", stand_in.fit)
    monkeypatch.setattr(pipeline, "refit", stand_in.refit)
    monkeypatch.setattr(pipeline, "bundle", lambda *_, **__: result.bundled)
    monkeypatch.setattr(pipeline, "place_labels", stand_in.place_labels)
    monkeypatch.setattr(pipeline, "name_rooms", stand_in.wishes)
    for room in ("layout", "bundles", "labels"):
        monkeypatch.setattr(f"gtfs_schematic.{room}.check.faults", lambda *_: ())
    labelled = pipeline._labelled(result.network, QUICK, (), Silent())
    assert len(labelled.unplaced) == left
    assert len(stand_in.widened) == rounds
    assert len(stand_in.asked) == rounds - 1
    assert stand_in.widened == sorted(stand_in.widened), "usual places come first"
    # What is asked for is what the best so far lacks.
    best = [min(unplaced[: i + 1]) for i in range(rounds - 1)]
    assert [len(asked) for asked in stand_in.asked] == best


def test_a_layout_that_fails_at_once_is_an_error(result, monkeypatch):
    stand_in = Rounds([None], result)
    monkeypatch.setattr(
        pipeline, "place", lambda network, *_, **__: SimpleNamespace(network=network)
    )
    monkeypatch.setattr(pipeline, "fit", stand_in.fit)
    with pytest.raises(LayoutError, match="no room"):
        pipeline._labelled(result.network, QUICK, (), Silent())


def test_the_example_of_the_readme_runs(tmp_path, capsys, monkeypatch):
    text = (ROOT / "README.md").read_text("utf-8")
    (code,) = re.findall(r"```python\n(.*?)```", text, re.DOTALL)
    assert len([line for line in code.splitlines() if line.strip()]) <= 5
    monkeypatch.chdir(tmp_path)
    (tmp_path / "data").symlink_to(ROOT / "data")
    exec(compile(code, "README.md", "exec"), {})  # noqa: S102 - our own page
    stations = len(load_edition(tmp_path / "out" / "python").stations)
    assert capsys.readouterr().out.startswith(f"{stations} stations, residual 0.")


def test_the_commands_of_the_readme_exist():
    text = (ROOT / "README.md").read_text("utf-8")
    for script in re.findall(r"^    sh (\.ci/\w+)$", text, re.MULTILINE):
        assert (ROOT / script).is_file()
    assert "sh .ci/test" in (ROOT / ".ci" / "run").read_text("utf-8")
    assert os.access(ROOT / ".ci" / "run", os.X_OK)
    for name in FILES:
        assert f"| `{name}` |" in text


def test_an_edition_is_written_and_loaded(files, result, tmp_path):
    write_folder(tmp_path / "x", files)
    assert load_edition(tmp_path / "x") == result.edition
