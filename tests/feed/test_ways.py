"""Transfers, shapes, translations and credits."""

from __future__ import annotations

import numpy as np
import pytest

from gtfs_schematic.feed.model import Transfer

HEAD = "from_stop_id,to_stop_id,transfer_type,min_transfer_time,from_route_id,to_route_id\n"


def test_transfers_between_different_stops_are_kept(read_town):
    rows = (
        "gate,tams,,,,\n"  # names a station
        "gate1,gate2,2,90,,\n"
        "tams,tams,1,,,\n"
        "vend,tams,3,,t1,b7\n"
        "tams,vend,3,,,\n"
        "tams,vend,3,,,\n"
        "parv,vend,2,soon,,\n"
        "parv,lost,0,,,\n"
        "vend,parv,7,,,\n"
    )
    timetable = read_town({"transfers.txt": HEAD + rows})
    assert timetable.transfers == (
        Transfer("gate", "tams", 0, None),
        Transfer("gate1", "gate2", 2, 90),
        Transfer("parv", "vend", 2, None),
        Transfer("tams", "vend", 3, None),
    )
    assert {(item.id, item.reason) for item in timetable.left_out if item.kind == "transfer"} == {
        ("vend → tams, type 3", "forbidden for certain routes or trips only"),
        ("parv → lost", "it names a stop that is not in the timetable"),
        ("vend → parv, type 7", "its type is unknown"),
    }
    assert {f.value for f in timetable.findings} == {"soon", "lost", "7"}


def test_a_transfer_to_a_stop_that_nothing_calls_at_is_left_out(read_town):
    timetable = read_town({"transfers.txt": f"{HEAD}gate2,parv,0,\n"}, date="2026-03-07")
    assert timetable.transfers == ()
    assert ("transfer", "gate2 → parv") in {(item.kind, item.id) for item in timetable.left_out}


def test_shapes_are_in_order_of_number_and_only_used_ones(read_town, table):
    text = table("shapes.txt") + "other,47.0,8.0,1\nother,47.1,8.1,2\n"
    shapes = read_town({"shapes.txt": text}).shapes
    assert list(shapes) == ["up"]
    np.testing.assert_array_equal(shapes["up"], [[8.0, 47.0], [8.0, 47.01], [8.02, 47.03]])
    with pytest.raises(ValueError, match="read-only"):
        shapes["up"][0, 0] = 1.0


def test_bad_points_are_found_and_short_shapes_are_none(read_town, table):
    text = table("shapes.txt").replace("47.010", "0").replace("8.000,10", "0,10")
    timetable = read_town({"shapes.txt": text})
    assert len(timetable.shapes["up"]) == 2
    assert [(f.severity, f.row) for f in timetable.findings] == [("warning", 4)]
    timetable = read_town({"shapes.txt": text.replace("47.030", "north")})
    assert timetable.shapes == {}
    assert {pattern.shape_id for pattern in timetable.patterns} == {None}
    assert ("trips.txt", "shape_id", "up") in {
        (f.file, f.field, f.value) for f in timetable.findings
    }


def test_a_feed_without_shapes_is_drawn_without(read_town):
    timetable = read_town({"shapes.txt": None})
    assert timetable.shapes == {}
    assert len(timetable.patterns) == 3


NEW = """\
table_name,field_name,language,translation,record_id,record_sub_id,field_value
stops,stop_name,fr,Porte d'Oulm,gate,,
stops,stop_name,fr,Tamselle,,,Tamselby
stops,stop_name,fr,wrong,,,tamselby
stops,stop_name,fr,Écluses,vend,,
stops,stop_name,fr,less,,,Vendrick Locks
stops,stop_name,fr,Parvinholm,parv,,
stops,stop_desc,fr,no name,gate1,,
routes,route_long_name,fr,no stop,tams,,
stops,stop_name,fr-CA,Barrière,gate,,
stops,stop_name,zh-Hant,塔村,tams,,
"""
OLD = "trans_id,lang,translation\nTamselby,fr,Tamselle\nOulmgate,fr,Porte d'Oulm\n"


def second_names(timetable):
    return {stop.id: stop.second_name for stop in timetable.stops if stop.second_name}


def test_translations_give_second_names(read_town):
    changes = {"translations.txt": NEW}
    # By id wins over by name, the case counts, and a second name equal to the first is none.
    assert second_names(read_town(changes, language="fr")) == {
        "gate": "Porte d'Oulm",
        "tams": "Tamselle",
        "vend": "Écluses",
    }
    assert second_names(read_town(changes)) == {}


@pytest.mark.parametrize(
    ("language", "expected"),
    [
        ("FR-ca", {"gate": "Barrière"}),
        ("zh", {"tams": "塔村"}),
        ("zh-Hant-TW", {"tams": "塔村"}),
        ("de", {}),
        ("f", {}),
    ],
)
def test_language_tags_fit_as_in_rfc_4647(read_town, language, expected):
    assert second_names(read_town({"translations.txt": NEW}, language=language)) == expected


def test_the_older_form_of_translations_is_understood(read_town):
    names = second_names(read_town({"translations.txt": OLD}, language="fr"))
    assert names == {
        "gate": "Porte d'Oulm",
        "gate1": "Porte d'Oulm",
        "gate2": "Porte d'Oulm",
        "tams": "Tamselle",
    }


def test_credits_are_those_of_the_feed_and_of_what_is_drawn(read_town):
    rows = (
        "organization_name,agency_id,route_id,trip_id,is_producer\n"
        "Oulm Region,,,,1\nTram Data,,t1,,1\nBus Data,,b7,,1\nOther,else,,,1\nTrip,,,t1a,1\n"
        "Oulm Region,oulm,,,1\n"
    )
    weekday = read_town({"attributions.txt": rows})
    assert weekday.info.attributions == ("Bus Data", "Oulm Region", "Tram Data")
    saturday = read_town({"attributions.txt": rows}, date="2026-03-07")
    assert saturday.info.attributions == ("Oulm Region", "Tram Data")


def test_a_language_that_the_feed_lacks_is_told_with_those_that_it_has(read_town):
    (finding,) = read_town({"translations.txt": OLD}, language="it").findings
    assert (finding.file, finding.value) == ("translations.txt", "it")
    assert finding.message.endswith("; there is fr")
    (none,) = read_town(language="it").findings
    assert none.message.endswith("; there is no other")


@pytest.mark.parametrize(
    "row", ["stops,stop_name,,X,tams,", "stops,stop_name,fr,,tams,", ",,fr,X,,"]
)
def test_translations_that_say_nothing_are_found(read_town, row):
    head = "table_name,field_name,language,translation,record_id,field_value\n"
    good = "stops,stop_name,fr,Tamselle,tams,\n"
    timetable = read_town({"translations.txt": f"{head}{good}{row}\n"}, language="fr")
    assert second_names(timetable)["tams"] == "Tamselle"
    expected = [] if row.startswith(",,") else [("translations.txt", 3)]
    assert [(f.file, f.row) for f in timetable.findings] == expected
