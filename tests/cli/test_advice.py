"""Advice fits the network and the day."""

from __future__ import annotations

import datetime as dt
from types import SimpleNamespace

import pytest

from gtfs_schematic.cli.advice import expiry, suggestions

INFO = SimpleNamespace(start_date="2026-03-02", end_date="2026-03-28")


def network(lines, agencies=("Oulm",), findings=()):
    made = [SimpleNamespace(mode=mode, trips=trips) for mode, trips in lines]
    return SimpleNamespace(lines=made, agencies=agencies, findings=findings)


@pytest.mark.parametrize(
    ("day", "told"),
    [
        ("2026-03-01", "not valid yet: it starts on 2026-03-02"),
        ("2026-03-02", ""),
        ("2026-03-28", ""),
        ("2026-03-29", "expired: it was valid until 2026-03-28, and today is 2026-03-29"),
    ],
)
def test_a_feed_that_does_not_hold_today_is_told(day, told):
    said = expiry(INFO, dt.date.fromisoformat(day))
    assert told in said
    assert bool(said) == bool(told)


def test_many_lines_of_a_mode_can_be_thinned():
    lines = [("metro", 200)] * 3 + [("bus", 2 * n) for n in range(1, 49)]
    many, rare = suggestions(network(lines))
    # With 51 lines, 21 must go: those with fewer than 44 trips; 60 is the first round number above.
    assert many == (
        "48 bus lines: consider --mode to keep only metro, or --min-trips 60, which leaves "
        "22 lines."
    )
    assert rare.startswith("2 lines with fewer than 5 trips: consider --min-trips 5")


def test_small_networks_need_no_advice():
    assert suggestions(network([("tram", 80), ("bus", 40)], ("Oulm", "Locks"))) == []


def test_agencies_and_errors_are_pointed_at():
    findings = (SimpleNamespace(severity="error"),)
    told = suggestions(network([("bus", 500)] * 40, ("Oulm", "Locks"), findings))
    assert told[0] == "40 bus lines: consider --route to keep only some."
    assert told[1:] == [
        "2 agencies: consider --agency to keep only some of Oulm, Locks.",
        "Errors in the feed may hide lines or stops: tell its publisher.",
    ]
