"""An edition's folder is written whole or not at all, and nothing else is ever replaced."""

from __future__ import annotations

import importlib.util
import stat
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
