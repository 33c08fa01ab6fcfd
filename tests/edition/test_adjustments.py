"""Adjustments are read strictly: wrong keys, values and contradictions are named."""

from __future__ import annotations

import pytest

from gtfs_schematic.edition.adjustments import adjustments_from_toml, adjustments_of, plain
from gtfs_schematic.errors import UsageError

WHOLE = """
[stations.mill]
name = "Mill"
label_side = "NE"
pin_mm = [40, 52.5]
note = "as agreed"

[stations."8:12"]
hide = true

[lines.t6]
color = "#AA0011"
text_color = "#FFFFFF"

[abbreviations]
Street = "St"

[[merge]]
stations = ["a", "b"]
name = "A and B"

[[split]]
station = "c"
parts = [{stops = ["c1"]}, {stops = ["c2", "c3"], name = "C below"}]

[[same_station]]
old = "x"
new = "y"
"""


def test_all_kinds_are_read_and_kept():
    adjustments = adjustments_from_toml(WHOLE.encode(), "a.toml")
    assert adjustments.stations["mill"].pin_mm == (40.0, 52.5)
    assert adjustments.stations["8:12"].hide
    assert adjustments.split[0].parts[1].name == "C below"
    assert adjustments_of(plain(adjustments), "edition.json") == adjustments


@pytest.mark.parametrize(
    ("text", "told"),
    [
        ('[stations.x]\nlabelside = "N"', "unknown key stations.x.labelside: did you mean label_"),
        ('[station.x]\nname = "N"', "unknown key station: did you mean stations?"),
        ('[lines.x]\ncolour = "#000000"', "unknown key lines.x.colour: did you mean color?"),
        ("[[merge]]\nzzz = 1\nstations = ['a', 'b']", "merge.0.zzz: known here: name, stations"),
        ("[[split]]\nstation = 'a'\nparts = [{stop = ['b']}, {stops = ['c']}]", "mean stops?"),
        ('[lines.x]\ncolor = "red"', "lines.x.color = 'red'"),
        ('[stations.x]\nlabel_side = "up"', "stations.x.label_side = 'up'"),
        ("[[merge]]\nstations = ['a']", "merge.0.stations"),
        ("stations = 3", "stations = 3"),
        ("= 3", "not TOML"),
    ],
)
def test_what_is_wrong_is_named(text, told):
    with pytest.raises(UsageError) as caught:
        adjustments_from_toml(text.encode(), "a.toml")
    assert str(caught.value).startswith("a.toml: ")
    assert told in str(caught.value)


@pytest.mark.parametrize(
    ("text", "both"),
    [
        ("[[merge]]\nstations=['a','b']\n[[merge]]\nstations=['b','c']", ("merge.0", "merge.1")),
        (
            "merge=[{stations=['a','b']}]\nsplit=[{station='a',parts=[{stops=['1']},{stops=['2']}]}]",
            ("merge.0", "split.0"),
        ),
        (
            "[[same_line]]\nold='a'\nnew='b'\n[[same_line]]\nold='a'\nnew='c'",
            ("same_line.0.old", "same_line.1.old"),
        ),
    ],
)
def test_contradictions_name_both(text, both):
    with pytest.raises(UsageError) as caught:
        adjustments_from_toml(text.encode(), "a.toml")
    assert all(name in str(caught.value) for name in both)
