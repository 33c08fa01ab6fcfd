"""Command `revise`: refuses to write over the edition it revises, and names what is missing."""

from __future__ import annotations

from pathlib import Path

from gtfs_schematic.cli.main import run

DATA = Path(__file__).parent.parent.parent / "data"


def test_the_edition_itself_is_never_the_target(tmp_path, capsys):
    code = run(["revise", str(tmp_path), str(DATA / "after.zip"), "--out", str(tmp_path)])
    assert code == 2
    assert "is the edition that is revised" in capsys.readouterr().err


def test_a_missing_edition_is_named(tmp_path, capsys):
    out = str(tmp_path / "new")
    code = run(["revise", str(tmp_path / "none"), str(DATA / "after.zip"), "--out", out])
    assert code == 3
    assert "cannot read the edition" in capsys.readouterr().err
    assert not (tmp_path / "new").exists()
