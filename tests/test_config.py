"""Settings are read strictly, and the standard file tells the truth."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path

import pytest

from gtfs_schematic.config import Settings, settings_from_toml, settings_of, with_values
from gtfs_schematic.errors import UsageError

STANDARD = Path(__file__).parent.parent / "configs" / "standard.toml"


def test_the_standard_file_holds_every_default_and_nothing_else():
    listed = tomllib.loads(STANDARD.read_text("utf-8"))
    assert listed == Settings().model_dump(mode="json")
    assert settings_from_toml(STANDARD.read_bytes(), "standard.toml") == Settings()


def test_the_standard_file_explains_every_value():
    """Above every key stands a comment of its own."""
    lines = STANDARD.read_text("utf-8").splitlines()
    keys = [i for i, line in enumerate(lines) if re.match(r"[a-z_]+ = |\[[a-z]+\.", line)]
    assert len(keys) == sum(len(room) for room in Settings().model_dump().values())
    for i in keys:
        assert lines[i - 1].startswith("# "), lines[i]


def test_every_config_in_the_repository_is_valid():
    files = sorted(STANDARD.parent.glob("*.toml"))
    assert STANDARD in files
    for file in files:
        settings = settings_from_toml(file.read_bytes(), file.name)
        assert (settings == Settings()) == (file == STANDARD), file


def test_what_a_file_leaves_out_keeps_its_default():
    settings = settings_from_toml(b"[layout]\nfidelity = 0.5\n", "mine.toml")
    assert settings.layout.fidelity == 0.5
    assert settings.model_copy(update={"layout": Settings().layout}) == Settings()


def test_a_date_may_stand_without_quotation_marks():
    assert settings_from_toml(b"[feed]\ndate = 2026-03-11", "x").feed.date == "2026-03-11"


def test_a_byte_order_mark_is_no_fault():
    assert settings_from_toml(b"\xef\xbb\xbf[feed]\nlanguage = 'cy'", "x").feed.language == "cy"


@pytest.mark.parametrize(
    ("text", "parts"),
    [
        (b"[layout\n", ["mine.toml: not TOML"]),
        (b"\xff\xfe", ["not TOML in UTF-8"]),
        (b"[layuot]\nfidelity = 1", ["unknown key layuot", "did you mean layout?"]),
        (b"[labels]\nsize = 9", ["unknown key labels.size in [labels]", "labels.size_pt"]),
        (
            b"[layout]\nzzz = 1",
            ["unknown key layout.zzz", "known here: ", "directions, "],
        ),
        (b"[layout]\nfidelity = 2", ["layout.fidelity = 2", "less than or equal to 1"]),
        (b"[layout]\nfidelity = 'a'", ["layout.fidelity = 'a'", "valid number"]),
        (b"[layout]\neffort = 'max'", ["layout.effort = 'max'", "'thorough'"]),
        (b"[drawing]\nink = 'red'", ["drawing.ink = 'red'"]),
        (b"[sheet]\nsize = 'A9'", ["sheet.size = 'A9'", "A5"]),
        (b"layout = 3", ["layout = 3"]),
        (b"[feed]\nmodes = 'bus'", ["feed.modes = 'bus'"]),
    ],
)
def test_wrong_settings_are_named_with_their_path(text, parts):
    with pytest.raises(UsageError) as caught:
        settings_from_toml(text, "mine.toml")
    for part in parts:
        assert part in str(caught.value)


def test_all_wrong_keys_are_named_at_once():
    with pytest.raises(UsageError) as caught:
        settings_of({"feed": {"dat": "x"}, "layout": {"fidelity": -1}}, "c")
    assert "feed.date" in str(caught.value)
    assert "layout.fidelity" in str(caught.value)


def test_options_win_over_the_file():
    file = settings_from_toml(b"[layout]\nfidelity = 0.5\neffort = 'quick'", "mine.toml")
    both = with_values(file, {"layout.fidelity": 0.7, "feed.modes": ("tram",)}, "options")
    assert (both.layout.fidelity, both.layout.effort, both.feed.modes) == (0.7, "quick", ("tram",))


def test_settings_cannot_be_changed_in_place():
    with pytest.raises(ValueError, match="frozen"):
        Settings().layout.fidelity = 0.1
