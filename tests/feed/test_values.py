"""Values against second methods: datetime, partridge's parser, and formatting back."""

from __future__ import annotations

import datetime as dt
import warnings

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.feed.values import (
    clean_name,
    is_nowhere,
    parse_color,
    parse_date,
    parse_degrees,
    parse_time,
    parse_whole,
)

with warnings.catch_warnings():
    warnings.simplefilter("ignore")  # of partridge's own imports
    from partridge.parsers import parse_time as partridge_time


def refuses(parse, *args: object):
    try:
        parse(*args)
    except ValueError:
        return True
    return False


@given(st.integers(0, 120), st.integers(0, 59), st.integers(0, 59), st.booleans())
def test_times_agree_with_timedelta_and_partridge(hours, minutes, seconds, padded):
    text = (
        f"{hours:02}:{minutes:02}:{seconds:02}" if padded else f"{hours}:{minutes:02}:{seconds:02}"
    )
    exact = dt.timedelta(hours=hours, minutes=minutes, seconds=seconds).total_seconds()
    assert parse_time(text) == exact == partridge_time(text)


@pytest.mark.parametrize(
    "text", ["6:20", "06:60:00", "06:00:61", "-1:00:00", "6:0:0", "", "06:00:00 pm", "\u0660:00:00"]
)
def test_what_is_no_time_is_refused(text):
    assert refuses(parse_time, text)


@given(st.dates())
def test_dates_agree_with_strptime(date):
    text = date.isoformat().replace("-", "")
    assert parse_date(text) == dt.datetime.strptime(text, "%Y%m%d").date() == date  # noqa: DTZ007


@pytest.mark.parametrize("text", ["2026-03-02", "20260230", "260302", "20261301", ""])
def test_what_is_no_date_is_refused(text):
    assert refuses(parse_date, text)


@given(st.integers(0, 0xFFFFFF), st.booleans())
def test_colors_keep_their_number(number, upper):
    text = f"{number:06X}" if upper else f"{number:06x}"
    assert int(parse_color(text)[1:], 16) == number
    assert parse_color(text)[1:] == text.upper()


@pytest.mark.parametrize("text", ["FFF", "GG0000", "#FFFFFF", "FFFFFFFF", "red", ""])
def test_what_is_no_color_is_refused(text):
    assert refuses(parse_color, text)


@given(st.floats(-180, 180))
def test_degrees_come_back_exactly(degrees):
    assert parse_degrees(repr(degrees), 180.0) == degrees


@pytest.mark.parametrize("text", ["nan", "inf", "1e999", "90.0001", "47,5", "47°", "0x1F", "1_0"])
def test_what_is_no_latitude_is_refused(text):
    assert refuses(parse_degrees, text, 90.0)


@pytest.mark.parametrize("text", ["1.0", "x", "", "1_000", "²"])
def test_what_is_no_whole_number_is_refused(text):
    assert refuses(parse_whole, text)


def test_nowhere_is_the_sea_at_zero_and_the_poles():
    assert is_nowhere(0.0, 0.0)
    assert is_nowhere(12.0, 90.0)
    # São Tomé and Accra, the nearest large places (coordinates from memory)
    assert not is_nowhere(6.73, 0.34)
    assert not is_nowhere(-0.19, 5.55)


@given(st.text())
def test_clean_names_hold_nothing_that_xml_forbids(text):
    cleaned = clean_name(text)
    # XML 1.0 (Fifth Edition), production 2, Char
    assert all(
        char in "\t\n\r"
        or "\x20" <= char <= "\ud7ff"
        or "\ue000" <= char <= "\ufffd"
        or char > "\uffff"
        for char in cleaned
    )
    assert cleaned == " ".join(cleaned.split(" "))
    assert clean_name(cleaned) == cleaned
    kept = [char for char in text if char.isprintable() and not char.isspace()]
    assert all(char in cleaned for char in kept)
