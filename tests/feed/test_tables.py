"""Strict reading of the tables: what is normal, what is found, what is refused."""

from __future__ import annotations

import pytest

from gtfs_schematic.errors import FeedError


def found(timetable, file):
    return [(f.severity, f.row, f.field, f.value) for f in timetable.findings if f.file == file]


def test_mark_line_ends_quotes_and_spaces_do_not_matter(read_town, table):
    plain = read_town()
    text = (
        table("stops.txt").replace("Tamselby", '"Tamselby"').replace(",stop_name,", ", stop_name ,")
    )
    odd = b"\xef\xbb\xbf" + text.replace("\n", "\r\n\r\n").encode()
    assert read_town({"stops.txt": odd}).stops == plain.stops


def test_a_quoted_line_end_is_one_row_and_becomes_a_space(read_town, table):
    text = table("stops.txt").replace("Tamselby", '"Tamselby\r\n, ""Mill"""')
    text = text.replace("47.020", "north")
    timetable = read_town({"stops.txt": text})
    names = {stop.id: stop.name for stop in timetable.stops}
    assert names["tams"] == 'Tamselby , "Mill"'
    # vend is the fifth stop, so row 6, although a line end stands in the row before
    assert ("error", 6, "stop_lat", "north") in found(timetable, "stops.txt")


def test_all_that_is_missing_is_named_at_once(town, read_town, table):
    changes = {
        "trips.txt": None,
        "Trips.txt": table("trips.txt"),
        "calendar.txt": None,
        "stops.txt": table("stops.txt").replace("stop_lat", "Stop_Lat"),
        "routes.txt": table("routes.txt").replace("route_type", "kind"),
    }
    with pytest.raises(FeedError) as caught:
        read_town(changes)
    for told in (
        "trips.txt (found 'Trips.txt')",
        "calendar.txt or calendar_dates.txt",
        "column stop_lat (found 'Stop_Lat') of stops.txt",
        "column route_type of routes.txt",
    ):
        assert told in str(caught.value)


def test_an_empty_file_lacks_all_its_columns(read_town):
    with pytest.raises(FeedError, match=r"lacks a header in stops.txt: its first row"):
        read_town({"stops.txt": ""})
    assert read_town({"transfers.txt": "", "shapes.txt": ""}).transfers == ()


def test_ragged_rows_are_found_and_only_clear_ones_are_read(read_town, table):
    text = table("stops.txt") + "more,More,5,47.0,8.0\nodd,Odd, East,6,47.0,8.0,0,,1\n"
    text = text.replace(
        "parv,Parvinholm,4,47.030,8.020,0,,2", "parv,Parvinholm,4,47.030,8.020,0,,2,,"
    )
    timetable = read_town({"stops.txt": text})
    assert found(timetable, "stops.txt") == [
        ("info", 7, None, None),
        ("warning", 8, "location_type", None),
        ("error", 9, None, "1"),
    ]
    left_out = {item.id for item in timetable.left_out if item.kind == "stop"}
    assert "more" in left_out
    assert "odd" not in left_out


def test_utf16_is_refused_as_not_utf8(read_town, table):
    with pytest.raises(FeedError, match=r"stops.txt, row 1.*not UTF-8"):
        read_town({"stops.txt": table("stops.txt").encode("utf-16")})


def test_valid_text_beyond_ascii_is_kept(read_town, table):
    text = table("stops.txt").replace("Tamselby", "Tämselby 塔").replace("tams", "täms")
    times = table("stop_times.txt").replace("tams", "täms")
    timetable = read_town({"stops.txt": text, "stop_times.txt": times})
    assert {s.id: s.name for s in timetable.stops}["täms"] == "Tämselby 塔"


@pytest.mark.parametrize("bad", ['"Tamselby', 'x"', '"Tams"elby'])
def test_quotes_that_do_not_match_are_refused_or_harmless(read_town, table, bad):
    text = table("stops.txt").replace("tams,Tamselby", f"tams,{bad}")
    if bad.startswith('"'):
        with pytest.raises(FeedError, match=r"stops.txt, row \d+: cannot be read as CSV"):
            read_town({"stops.txt": text})
    else:  # a quote inside an unquoted text means itself
        assert bad in {stop.name for stop in read_town({"stops.txt": text}).stops}


def test_a_doubled_column_is_refused(read_town, table):
    text = table("routes.txt").replace("route_long_name", "route_short_name")
    with pytest.raises(FeedError, match="field route_short_name: stands twice in the header"):
        read_town({"routes.txt": text})


def test_ids_are_text_even_if_they_look_like_nothing_or_a_number(read_town, table):
    swap = {"stops.txt": "tams", "stop_times.txt": "tams"}
    for ident in ("NA", "007", "null", "1e5"):
        changes = {name: table(name).replace(old, ident) for name, old in swap.items()}
        assert ident in {stop.id for stop in read_town(changes).stops}


def test_doubled_and_empty_ids_are_found_and_the_first_counts(read_town, table):
    text = table("stops.txt") + "tams,Second,,1.5,1.5,0,,\n,Nameless,,47.0,8.0,0,,\n"
    timetable = read_town({"stops.txt": text})
    assert {s.id: s.name for s in timetable.stops}["tams"] == "Tamselby"
    assert found(timetable, "stops.txt") == [
        ("error", 8, "stop_id", "tams"),
        ("error", 9, "stop_id", ""),
    ]


@pytest.mark.parametrize(
    ("in_file", "kept"), [("b\x007", "b\\x007"), ("b\u00a07", "b\u00a07"), ("b\u200b7", "b\u200b7")]
)
def test_invisible_characters_in_an_id_are_found_and_the_tables_stay_joined(
    read_town, table, in_file, kept
):
    names = ("routes.txt", "trips.txt")
    changes = {name: table(name).replace("b7,", f"{in_file},", 1) for name in names}
    timetable = read_town(changes)
    assert {route.id for route in timetable.routes} == {kept, "t1"}
    assert ("warning", 3, "route_id", kept) in found(timetable, "routes.txt")


def test_a_systematic_fault_is_listed_a_few_times_and_counted(read_town, table):
    rows = "".join(f"x{n},X,,north,8.0,0,,\n" for n in range(50))
    timetable = read_town({"stops.txt": table("stops.txt") + rows})
    told = [f.message for f in timetable.findings if f.field == "stop_lat"]
    assert len(told) == 21
    assert any("so in 50 places" in message for message in told)


def test_a_header_that_stands_again_is_no_row(read_town, table):
    """As where files were put together."""
    names = ("stops.txt", "stop_times.txt", "trips.txt", "calendar.txt", "shapes.txt")
    changes = {name: table(name) + table(name).splitlines()[0] + "\n" for name in names}
    timetable = read_town(changes)
    assert timetable.patterns == read_town().patterns
    assert timetable.left_out == read_town().left_out
    rows = {name: len(text.splitlines()) for name, text in changes.items()}
    # A shape is asked for by its id only, so that other rows of shapes.txt are not looked at.
    assert {(f.file, f.row) for f in timetable.findings} == {
        (name, row) for name, row in rows.items() if name != "shapes.txt"
    }


@pytest.mark.parametrize("name", ["stops.txt", "stop_times.txt"])
def test_a_value_without_end_is_refused(read_town, table, name):
    head, row, *rest = table(name).splitlines()
    ragged = "\n".join([f"{head},note", f"{row},{'x' * 10_000_000}", *rest]) + "\n"
    told = rf"{name}, row 2: holds a value of more than 131,072 characters"
    with pytest.raises(FeedError, match=told):
        read_town({name: ragged})


def test_a_quote_that_never_ends_is_told_as_such(read_town, table):
    text = table("stops.txt").replace("Vendrick", '"Vendrick')
    with pytest.raises(FeedError, match=r"stops.txt, row 6: .*a quote opens here and never ends"):
        read_town({"stops.txt": text})
