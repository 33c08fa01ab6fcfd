"""Places of another drawing are read from a table, and measured like an edition."""

from __future__ import annotations

import pytest
import small_diagrams

from gtfs_schematic.drift.measure import measure_edition
from gtfs_schematic.drift.redrawn import places_from_csv, redrawn
from gtfs_schematic.errors import EditionError

DIAGRAM = small_diagrams.two_ways()


def table(*, up: bool, unit: float = 1.0, key: str = "stop") -> bytes:
    """Write the diagram's own places, a row per platform or per station."""
    rows = ["stop_id,x,y"]
    for s in DIAGRAM.stations:
        y = -s.y_mm if up else s.y_mm
        ids = s.stop_ids if key == "stop" else (s.id,)
        rows += [f"{stop},{s.x_mm * unit!r},{y * unit!r}" for stop in ids]
    return "\n".join(rows).encode()


@pytest.mark.parametrize("up", [True, False])
@pytest.mark.parametrize("key", ["stop", "station"])
def test_the_diagrams_own_places_give_its_own_drift(up, key):
    other = redrawn(DIAGRAM, places_from_csv(table(up=up, key=key), y_up=up))
    ours, theirs = measure_edition(DIAGRAM), measure_edition(other)
    assert theirs.summary == ours.summary
    assert theirs.journeys == ours.journeys
    assert other.missing == ()


def test_the_unit_does_not_matter():
    ours = measure_edition(DIAGRAM)
    theirs = measure_edition(
        redrawn(DIAGRAM, places_from_csv(table(up=False, unit=37.5), y_up=False))
    )
    assert theirs.journeys.mean == pytest.approx(ours.journeys.mean)
    assert theirs.north_up.scale_mm_per_km == pytest.approx(37.5 * ours.north_up.scale_mm_per_km)
    for a, b in zip(ours.stations, theirs.stations, strict=True):
        assert b.displacement_m == pytest.approx(a.displacement_m)


def test_y_the_wrong_way_is_a_mirror_image():
    upside = redrawn(DIAGRAM, places_from_csv(table(up=True), y_up=False))
    assert measure_edition(upside).summary.order_flips > 0.2


def test_a_station_lies_at_the_mean_of_its_stops():
    places = places_from_csv(
        b"Stop_ID , X, Y\r\na1,0,0\r\na2,4,2\r\n\r\nb1,9,9\r\n,7,7", y_up=False
    )
    other = redrawn(DIAGRAM, places)
    assert [(s.id, s.x_mm, s.y_mm) for s in other.stations] == [("a", 2, 1), ("b", 9, 9)]
    assert [k.id for k in other.links] == ["ab"]
    assert other.walks == ()
    assert other.missing == ("c", "d", "e", "f")


def test_lines_are_cut_where_stations_are_missing():
    """Without B no ride passes it: from A to D only line 2 is left."""
    places = {s.id: (s.x_mm, s.y_mm) for s in DIAGRAM.stations if s.id != "b"}
    found = measure_edition(redrawn(DIAGRAM, places))
    assert found.journeys.largest == 1.0
    assert found.journeys.pairs == 5 * 4 - 2


@pytest.mark.parametrize(
    ("data", "message"),
    [
        (b"", "no column 'stop_id'"),
        (b"stop_id,x\na,1", "no column 'y'"),
        (b"stop_id,x,y\na1,1,2\nb1,east,3", "row 3: x = 'east' is no number"),
        (b"stop_id,x,y\na1,1", "row 2: y = '' is no number"),
        (b"stop_id,x,y\na1,1,inf", "row 2: y = 'inf' is no number"),
        (b"\xff\xfe", "not a CSV file in UTF-8"),
        (b"stop_id,x,y\nzz,1,2\na1,1,2", "places 1 of the edition's 6 stations"),
    ],
)
def test_wrong_tables_are_named(data, message):
    with pytest.raises(EditionError, match=message):
        redrawn(DIAGRAM, places_from_csv(data, y_up=False))
