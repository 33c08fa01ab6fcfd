"""Feeds that lack what no diagram can do without: all of it is named, with what to do."""

from __future__ import annotations

import pytest

from gtfs_schematic.errors import FeedError


def refusal(read_town, changes):
    with pytest.raises(FeedError) as caught:
        read_town(changes)
    return str(caught.value)


def test_all_columns_of_a_table_are_named_together(read_town, table):
    text = table("stops.txt").replace("stop_lat,stop_lon", "Stop_Lat,longitude")
    assert refusal(read_town, {"stops.txt": text}) == (
        "town.zip lacks columns stop_lat (found 'Stop_Lat'), stop_lon of stops.txt. "
        "Names count letter by letter, capitals included. Ask the feed's publisher."
    )


@pytest.mark.parametrize(("mark", "noun"), [(";", "semicolons"), ("\t", "tabs"), ("|", "bars")])
def test_columns_that_are_not_separated_by_commas_are_told(read_town, table, mark, noun):
    told = refusal(read_town, {"stops.txt": table("stops.txt").replace(",", mark)})
    assert f"The columns of stops.txt are separated by {noun}; they must be by commas." in told


@pytest.mark.parametrize("name", ["routes.txt", "stop_times.txt", "stops.txt", "trips.txt"])
def test_a_table_with_nothing_but_a_header_is_told(read_town, table, name):
    told = refusal(read_town, {name: table(name).splitlines()[0] + "\n\n"})
    assert told.startswith(f"town.zip lacks rows in {name}: it has only a header.")


def test_a_table_without_a_header_is_told(read_town):
    told = refusal(read_town, {"trips.txt": "", "agency.txt": "\n"})
    assert "a header in agency.txt: its first row is empty" in told
    assert "a header in trips.txt: its first row is empty" in told


def test_a_feed_without_agencies_or_calendar_rows_is_judged_by_what_is_left(read_town, table):
    agency = table("agency.txt").splitlines()[0] + "\n"
    found = {(f.file, f.field) for f in read_town({"agency.txt": agency}).findings}
    assert found == {("routes.txt", "agency_id")}
    calendar = table("calendar.txt").splitlines()[0] + "\n"
    assert "town.zip has no service on any date" in refusal(read_town, {"calendar.txt": calendar})


@pytest.mark.parametrize("code", ["utf-16", "utf-16-le", "utf-16-be"])
def test_utf16_is_recognized_with_and_without_a_mark(read_town, table, code):
    told = refusal(read_town, {"stops.txt": table("stops.txt").encode(code)})
    assert told.startswith("stops.txt, row 1: is not UTF-8 text.")
    assert "UTF-16" in told
