"""`adjust` sets one thing from the command line, all or nothing."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import pytest

from gtfs_schematic.cli.main import run
from gtfs_schematic.edition.folder import FILES, load_edition, load_state

BEFORE = Path(__file__).parents[2] / "data" / "before.zip"


@pytest.fixture(scope="module")
def drawn(tmp_path_factory) -> Path:
    folder = tmp_path_factory.mktemp("adjust") / "drawn"
    assert run(["draw", str(BEFORE), "--out", str(folder), "--effort", "quick", "-q"]) == 0
    return folder


def adjust(drawn: Path, out: Path, *words: str) -> int:
    return run(["adjust", str(drawn), "-q", "--overwrite", "--out", str(out), *words])


@pytest.mark.parametrize(
    ("words", "kind", "said"),
    [
        (["--station", "183", "--name", "X"], "stations", {"183": {"name": "X"}}),
        (
            ["--station", "183", "--label-side", "S", "--label-angle", "0", "--note", "n"],
            "stations",
            {"183": {"label_side": "S", "label_angle": 0, "note": "n"}},
        ),
        (["--station", "183", "--rows", "A/B"], "stations", {"183": {"label_rows": ["A", "B"]}}),
        (["--station", "183", "--hide"], "stations", {"183": {"hide": True}}),
        (["--line", "m1", "--color", "#225577"], "lines", {"m1": {"color": "#225577"}}),
        (
            ["--link", "121", "101", "--order", "m4,m3", "--note", "n"],
            "links",
            [{"between": ["121", "101"], "order": ["m4", "m3"], "note": "n"}],
        ),
        (["--group", "t5", "--group", "t6"], "group", [{"lines": ["t5", "t6"]}]),
        (
            ["--merge", "106", "--merge", "343-1", "--name", "B"],
            "merge",
            [{"stations": ["106", "343-1"], "name": "B"}],
        ),
        (["--word", "Univaršét", "--short", "Univ."], "abbreviations", {"Univaršét": "Univ."}),
    ],
)
def test_what_is_said_stands_in_the_edition(drawn, tmp_path, words, kind, said):
    before = load_edition(drawn)
    assert adjust(drawn, tmp_path / "out", *words) == 0
    after = load_edition(tmp_path / "out")
    assert after.adjustments == {kind: said}
    assert load_state(tmp_path / "out", after) is not None
    assert load_edition(drawn) == before
    assert {file.name for file in (tmp_path / "out").iterdir()} == {*FILES, "state.json"}


def test_names_will_do_and_a_second_word_joins_the_first(drawn, tmp_path, capsys):
    out = tmp_path / "out"
    edition = load_edition(drawn)
    station = next(s for s in edition.stations if s.id == "183")
    assert adjust(drawn, out, "--station", station.name, "--short-name", "Mulg") == 0
    capsys.readouterr()
    # In place: no --out.
    assert run(["adjust", str(out), "-q", "--json", "--station", "183", "--label-side", "S"]) == 0
    document = json.loads(capsys.readouterr().out)
    assert document["adjustments"] == {
        "stations": {"183": {"short_name": "Mulg", "label_side": "S"}}
    }
    assert document["moved"] == []
    assert load_edition(out).adjustments == document["adjustments"]
    for drop in (["--drop", "short_name"], ["--drop", "all"]):
        assert run(["adjust", str(out), "-q", "--station", "183", *drop]) == 0
    after = load_edition(out)
    assert (after.adjustments, after.links) == ({}, edition.links)
    assert [replace(s, label_side="") for s in after.stations] == [
        replace(s, label_side="") for s in edition.stations
    ]
    sides = [
        (a.label_side, b.label_side)
        for a, b in zip(after.stations, edition.stations, strict=True)
        if a.label_side != b.label_side
    ]
    assert len(sides) <= 3


@pytest.mark.parametrize(
    ("words", "told"),
    [
        ([], "Say what is adjusted"),
        (["--station", "183"], "Say what --station is to be"),
        (["--station", "183", "--line", "m1", "--name", "X"], "--station and --line"),
        (["--station", "183", "--color", "#112233"], "--color does not go with --station"),
        (["--station", "nowhere", "--name", "X"], "no station of the edition"),
        (["--line", "zz", "--name", "X"], "no line of the edition"),
        (["--line", "m1", "--color", "red"], "lines.m1.color = 'red'"),
        (["--station", "183", "--pin", "12"], "give two numbers"),
        (["--station", "183", "--pin", "-500,2"], "no room"),
        (["--station", "183", "--beside", "152"], "--right, --below or both"),
        (["--station", "183", "--beside", "183", "--right", "0", "--below", "0"], "contradict"),
        (["--station", "183", "--drop", "name"], "cannot be taken back"),
        (["--station", "183", "--hide", "--name", "X"], "stations.183.hide and stations.183.name"),
        (["--link", "101", "183", "--direction", "E"], "no link joins 101 and 183"),
        (["--link", "101", "121", "--order", "b9,m3"], "b9 is not on the link"),
        (["--station", "183", "--straight", "b9"], "b9 does not pass through"),
    ],
)
def test_what_is_wrong_is_told_and_nothing_is_written(drawn, tmp_path, capsys, words, told):
    before = {file.name: file.read_bytes() for file in drawn.iterdir()}
    assert run(["adjust", str(drawn), "-q", *words]) in (2, 3)
    assert told in capsys.readouterr().err
    assert {file.name: file.read_bytes() for file in drawn.iterdir()} == before


def test_an_edition_without_a_state_cannot_be_adjusted(drawn, tmp_path, capsys):
    assert adjust(drawn, tmp_path / "out", "--station", "183", "--note", "x") == 0
    (tmp_path / "out" / "state.json").unlink()
    assert run(["adjust", str(tmp_path / "out"), "-q", "--station", "183", "--note", "y"]) == 2
    assert "state.json" in capsys.readouterr().err


def test_help_has_an_example(capsys):
    assert run(["adjust", "--help"]) == 0
    told = capsys.readouterr().out
    assert "Example:" in told
    assert "--label-side" in told
