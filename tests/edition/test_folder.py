"""An edition's folder is written whole or not at all, and nothing else is ever replaced."""

from __future__ import annotations

import importlib.util
import signal
import stat
import subprocess
import sys
from pathlib import Path

import pytest

from gtfs_schematic.edition.folder import FILES, check_target, load_edition, write_folder
from gtfs_schematic.edition.model import Edition, EditionFeed, EditionStation
from gtfs_schematic.edition.save import to_json
from gtfs_schematic.errors import EditionError, UsageError

EDITION = Edition(
    title="Ferries",
    feed=EditionFeed("0" * 64, "P", "v", "", "", "2026-03-11"),
    width_mm=100.0,
    height_mm=100.0,
    stations=(EditionStation("a", "A", ("a",), 1.0, 2.0, 3.0, 4.0, "stop", (), "a"),),
    links=(),
    lines=(),
)
CONTENT = {name: name.encode() for name in FILES} | {"edition.json": to_json(EDITION)}


def content(folder: Path) -> dict[str, bytes]:
    return {entry.name: entry.read_bytes() for entry in folder.iterdir()}


def test_a_new_folder_and_those_above_it(tmp_path):
    target = tmp_path / "a" / "b"
    write_folder(target, CONTENT)
    assert content(target) == CONTENT
    assert [entry.name for entry in target.parent.iterdir()] == ["b"]
    assert load_edition(target) == EDITION
    assert load_edition(target / "edition.json") == EDITION


def test_usual_rights(tmp_path):
    write_folder(tmp_path / "x", CONTENT)
    usual = tmp_path / "usual"
    usual.mkdir()
    assert stat.S_IMODE((tmp_path / "x").stat().st_mode) == stat.S_IMODE(usual.stat().st_mode)


def test_an_empty_folder_is_filled(tmp_path):
    target = tmp_path / "x"
    target.mkdir()
    write_folder(target, CONTENT)
    assert content(target) == CONTENT


def test_an_edition_is_replaced_only_when_asked(tmp_path):
    target = tmp_path / "x"
    write_folder(target, CONTENT)
    fresh = CONTENT | {"drift.csv": b"new"}
    with pytest.raises(UsageError, match="--overwrite"):
        write_folder(target, fresh)
    assert content(target) == CONTENT
    write_folder(target, fresh, overwrite=True)
    assert content(target) == fresh
    assert [entry.name for entry in tmp_path.iterdir()] == ["x"]


@pytest.mark.parametrize(
    "files",
    [
        {"thesis.txt": b"mine"},
        CONTENT | {"notes.txt": b"mine"},
        {"edition.json": b"{}"},
        {"diagram.svg": b"<svg/>"},
    ],
    ids=["other", "edition and more", "other edition.json", "only a diagram"],
)
def test_other_folders_are_never_replaced(tmp_path, files):
    target = tmp_path / "x"
    target.mkdir()
    for name, data in files.items():
        (target / name).write_bytes(data)
    with pytest.raises(UsageError, match="left alone"):
        write_folder(target, CONTENT, overwrite=True)
    assert content(target) == files


def test_a_file_is_never_replaced(tmp_path):
    target = tmp_path / "x"
    target.write_text("mine")
    with pytest.raises(UsageError, match="a file stands there"):
        write_folder(target, CONTENT, overwrite=True)
    assert target.read_text() == "mine"


def test_a_folder_below_a_file_is_refused_before_any_work(tmp_path):
    (tmp_path / "file").write_text("mine")
    with pytest.raises(UsageError, match=r"cannot be made in .*file\."):
        check_target(tmp_path / "file" / "a" / "b", overwrite=True)


def test_a_failed_write_leaves_the_old_edition(tmp_path, monkeypatch):
    target = tmp_path / "x"
    write_folder(target, CONTENT)
    whole = Path.write_bytes

    def full_disk(path: Path, data: bytes) -> int:
        if path.name == "drift.html":
            raise OSError(28, "No space left on device")
        return whole(path, data)

    monkeypatch.setattr(Path, "write_bytes", full_disk)
    with pytest.raises(EditionError, match="No space left on device"):
        write_folder(target, CONTENT | {"drift.csv": b"new"}, overwrite=True)
    assert content(target) == CONTENT
    assert [entry.name for entry in tmp_path.iterdir()] == ["x"]


def test_a_failed_rename_brings_the_old_edition_back(tmp_path, monkeypatch):
    """On systems that cannot exchange two folders in one step."""
    monkeypatch.setattr("gtfs_schematic.edition.folder.exchanged", lambda *_: False)
    target = tmp_path / "x"
    write_folder(target, CONTENT)
    whole = Path.rename

    def stubborn(path: Path, to: Path) -> Path:
        if to == target and "-old-" not in str(path):
            raise OSError(5, "Input/output error")
        return whole(path, to)

    monkeypatch.setattr(Path, "rename", stubborn)
    with pytest.raises(EditionError, match="Input/output error"):
        write_folder(target, CONTENT | {"drift.csv": b"new"}, overwrite=True)
    assert content(target) == CONTENT
    assert [entry.name for entry in tmp_path.iterdir()] == ["x"]


def test_a_link_keeps_pointing_where_it_did(tmp_path):
    real = tmp_path / "real"
    write_folder(real, CONTENT)
    link = tmp_path / "current"
    link.symlink_to(real)
    write_folder(link, CONTENT | {"drift.csv": b"new"}, overwrite=True)
    assert link.is_symlink()
    assert (real / "drift.csv").read_bytes() == b"new"


def test_loading_what_is_not_there_names_it(tmp_path):
    with pytest.raises(EditionError, match=r"nowhere.*cannot read the edition \(No such file"):
        load_edition(tmp_path / "nowhere")
    (tmp_path / "edition.json").write_text("{}")
    with pytest.raises(EditionError) as caught:
        load_edition(tmp_path)
    assert str(caught.value).startswith(str(tmp_path / "edition.json"))


def test_the_schemas_travel_with_the_package():
    for room, name in (("edition", "edition.schema.json"), ("drift", "drift.schema.json")):
        spec = importlib.util.find_spec(f"gtfs_schematic.{room}")
        assert Path(spec.origin).with_name(name).is_file()


_KILLED = """
import sys
from pathlib import Path
from gtfs_schematic.edition.folder import write_folder

steps, folder = int(sys.argv[1]), sys.argv[2]
files = {file.name: b"new" for file in Path(folder).iterdir()}
files["edition.json"] = (Path(folder) / "edition.json").read_bytes()
files["diagram.svg"] = b"new" * 200_000

def watch(event, arguments):
    # Every step on the disk is announced here before it is taken.
    global steps
    if event == "open" or event.split(".")[0] in {"os", "shutil", "tempfile", "ctypes"}:
        steps -= 1
        if steps == 0:
            import os, signal
            os.kill(os.getpid(), signal.SIGKILL)

sys.addaudithook(watch)
write_folder(folder, files, overwrite=True)
"""
_EVERY = 3


def test_killed_at_any_step_the_edition_is_the_old_or_the_new(tmp_path):
    """A killed process can tidy nothing up: what it leaves behind has a hidden name."""
    states = set()
    for step in (*range(1, 400, _EVERY), 10**6):
        target = tmp_path / str(step) / "edition"
        write_folder(target, CONTENT)
        command = [sys.executable, "-c", _KILLED, str(step), str(target)]
        code = subprocess.run(command, check=False).returncode
        assert code in (0, -signal.SIGKILL)
        found = content(target)
        assert load_edition(target) == EDITION
        state = "old" if found == CONTENT else "new"
        assert state == "old" or found["drift.csv"] == b"new"
        assert set(found) == set(CONTENT)
        beside = {entry.name for entry in target.parent.iterdir()} - {"edition"}
        assert all(name.startswith(".") for name in beside)
        states.add((code, state))
        if code == 0:
            break
    assert (-signal.SIGKILL, "old") in states
    assert (0, "new") in states
