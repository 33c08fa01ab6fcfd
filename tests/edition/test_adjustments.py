"""Adjustments are read strictly: wrong keys, values and contradictions are named."""

from __future__ import annotations

import pytest

from gtfs_schematic.edition.adjustments import adjustments_from_toml, adjustments_of, plain
from gtfs_schematic.edition.translated import translated
from gtfs_schematic.errors import UsageError

WHOLE = """
[stations.mill]
name = "Mill"
label_side = "NE"
pin_mm = [40, 52.5]
note = "as agreed"

[stations."8:12"]
hide = true

[stations.quay]
short_name = "Quay"
label_angle = 45
pin_from = { station = "mill", dx_mm = 20, dy_mm = 0 }
straight = ["t6"]

[stations.lock]
label_rows = ["Upper", "Lock"]
pin_from = { station = "quay", dy_mm = 0 }

[[links]]
between = ["mill", "quay"]
direction = "E"
order = ["t6", "t7"]
note = "as on the trains"

[[group]]
lines = ["n1", "n2"]
name = "N"
color = "#112233"

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
    assert adjustments.stations["lock"].pin_from.dx_mm is None
    assert adjustments.links[0].between == ("mill", "quay")
    assert adjustments.group[0].lines == ("n1", "n2")
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
        ('[stations.x]\npin_from = {station = "a"}', "stations.x.pin_from"),
        ("[stations.x]\nlabel_angle = 30", "stations.x.label_angle = 30"),
        ('[[link]]\nbetween = ["a", "b"]', "unknown key link: did you mean links?"),
        ('[[links]]\nbetween = ["a"]', "links.0.between"),
        ('[[links]]\nbetween = ["a", "b"]\ndirections = "E"', "did you mean direction?"),
        ('[[group]]\nlines = ["a"]', "group.0.lines"),
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
        ("[[group]]\nlines=['a','b']\n[[group]]\nlines=['b','c']", ("group.0", "group.1")),
        (
            "[stations.a]\npin_mm=[1,2]\npin_from={station='b',dx_mm=1}",
            ("stations.a.pin_mm", "stations.a.pin_from"),
        ),
        ("[stations.a]\nhide=true\nlabel_angle=0", ("stations.a.hide", "stations.a.label_angle")),
        (
            "[stations.a]\nshort_name='A'\nlabel_rows=['A','B']",
            ("stations.a.short_name", "stations.a.label_rows"),
        ),
        (
            "links=[{between=['a','b'],direction='E'},{between=['b','a'],order=['x','y']}]",
            ("links.0", "links.1"),
        ),
        (
            "links=[{between=['a','b'],direction='E'},{between=['c','a'],direction='W'}]",
            ("links.0.direction", "links.1.direction"),
        ),
    ],
)
def test_contradictions_name_both(text, both):
    with pytest.raises(UsageError) as caught:
        adjustments_from_toml(text.encode(), "a.toml")
    assert all(name in str(caught.value) for name in both)


def test_every_id_is_translated_and_nothing_else():
    adjustments = adjustments_from_toml(WHOLE.encode(), "a.toml")
    stations = {key: f"{key}'" for key in ("mill", "8:12", "quay", "lock", "a", "b", "c")}
    lines = {key: f"{key}'" for key in ("t6", "t7", "n1", "n2")}
    stops = {key: f"{key}'" for key in ("c1", "c2", "c3")}
    there = translated(adjustments, stations, lines, stops)
    text = str(plain(there))
    # Each id is named as often as before, now in the other way.
    before = str(plain(adjustments))
    for old, new in {**stations, **lines, **stops}.items():
        assert before.count(repr(old)) == text.count(repr(new)) > 0, old
        # Parts keep their ids, which are their first stops'.
        assert repr(old) not in text.replace("'id': 'c1'", "").replace("'id': 'c2'", "")
    assert [part.id for part in there.split[0].parts] == ["c1", "c2"]
    back = [{new: old for old, new in each.items()} for each in (stations, lines, stops)]
    assert translated(there, *back) == adjustments
