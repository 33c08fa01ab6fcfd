"""Drift is remembered over editions, and a limit on its growth is told."""

from __future__ import annotations

import itertools
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.edition.model import Edition, EditionDrift, EditionFeed
from gtfs_schematic.edition.ratchet import (
    RevisionSettings,
    advice,
    drifts_after,
    growth_of,
    told,
)

FEED = EditionFeed("", "", "", "", "", "2026-01-01")
FIRST = Edition("", FEED, 1.0, 1.0, (), (), ())


def series(residuals: list[float]) -> Edition:
    """Revise an edition again and again; hashes are its numbers."""
    edition = FIRST
    for number, (before, after) in enumerate(itertools.pairwise(residuals)):
        was = EditionDrift(f"{number:064x}", f"day {number}", before)
        now = EditionDrift("", f"day {number + 1}", after)
        edition = replace(edition, drifts=drifts_after(edition, was, now, anew=False))
    return edition


@given(st.lists(st.floats(0.01, 1.0), min_size=2, max_size=40))
def test_growth_is_from_the_first_edition_to_the_last(residuals: list[float]):
    drifts = series(residuals).drifts
    assert growth_of(drifts) == pytest.approx(residuals[-1] / residuals[0] - 1.0)
    assert (drifts[0].service_date, drifts[-1].edition) == ("day 0", "")
    assert len(drifts) == min(len(residuals), 12)
    # Of every edition but the last its hash is known; in between stand the latest.
    numbers = [int(each.edition, 16) for each in drifts[:-1]]
    latest = len(residuals) - 2
    assert numbers == [0, *range(latest - len(numbers) + 2, latest + 1)]


def test_laying_out_anew_begins_again():
    edition = series([0.2, 0.3, 0.4])
    now = EditionDrift("", "day 3", 0.1)
    assert drifts_after(edition, edition.drifts[-1], now, anew=True) == (now,)


def test_too_much_growth_is_told_with_what_to_do():
    drifts = series([0.2, 0.21, 0.23]).drifts
    assert "+15.0%" in told(drifts)
    assert advice(drifts, RevisionSettings()) == ""
    assert advice(drifts, RevisionSettings(most_drift_growth=0.2)) == ""
    text = advice(drifts, RevisionSettings(most_drift_growth=0.1))
    assert "15.0%" in text
    assert "revision.relax" in text


def test_a_first_edition_has_nothing_to_tell():
    assert told(()) == ""
    assert growth_of(series([0.2]).drifts) == 0.0
