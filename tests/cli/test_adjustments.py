"""Adjustments that are wrong are refused before any feed is read."""

from __future__ import annotations

import pytest

from gtfs_schematic.cli.main import run


@pytest.mark.parametrize("command", ["draw", "revise"])
@pytest.mark.parametrize(
    ("text", "told"),
    [
        ("[stations.a]\nnme = 'x'", "unknown key stations.a.nme: did you mean name?"),
        ("[lines.a]\ncolor = 'red'", "lines.a.color = 'red'"),
        (None, "cannot read the adjustments"),
    ],
)
def test_what_is_wrong_is_named(tmp_path, capsys, monkeypatch, command, text, told):
    monkeypatch.chdir(tmp_path)
    file = tmp_path / "adjustments.toml"
    if text is not None:
        file.write_text(text, "utf-8")
    feeds = ["feed.zip"] if command == "draw" else ["old", "feed.zip"]
    code = run([command, *feeds, "--adjustments", str(file), "--out", "out", "-q"])
    error = capsys.readouterr().err
    assert code == 2
    assert told in error
    assert "adjustments.toml" in error
    assert not (tmp_path / "out").exists()
