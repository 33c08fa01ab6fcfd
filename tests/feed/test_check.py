"""The check finds what is wrong: one thing is broken at a time."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from gtfs_schematic.feed.check import faults
from gtfs_schematic.feed.model import LeftOut, Timetable, Transfer


def first(part, /, **changes: object):
    """Give a function that changes the first item of a tuple of the timetable."""

    def change(timetable) -> Timetable:
        items = getattr(timetable, part)
        return replace(timetable, **{part: (replace(items[0], **changes), *items[1:])})

    return change


def info(**changes: object):
    return lambda timetable: replace(timetable, info=replace(timetable.info, **changes))


BREAKS = {
    "is no SHA-256": info(sha256="abc"),
    "is no date": info(start_date="2026-3-2"),
    "is outside": info(service_date="2027-01-01"),
    "no reason is given": info(service_reason=""),
    "stops: 'gate' follows": lambda t: replace(t, stops=t.stops[::-1]),
    "routes: 't1' follows 't1'": lambda t: replace(t, routes=(*t.routes, t.routes[-1])),
    "has no name": first("stops", name=" "),
    "has no place": first("stops", lat=None),
    "which is no place": first("stops", lon=float("nan")),
    "above it is missing": first("stops", parent_id="lost"),
    "is not the top one": first("stops", parent_id="gate2"),
    "neither called at nor above": lambda t: replace(
        t, patterns=tuple(p for p in t.patterns if "parv" not in p.stop_ids)
    ),
    "has no pattern": lambda t: replace(t, patterns=t.patterns[1:]),
    "of a pattern is missing": lambda t: replace(t, routes=t.routes[1:]),
    "unknown mode": first("routes", mode="zeppelin"),
    "which is none": first("routes", color="#ffffff"),
    "has the operating days None": lambda t: replace(t, operating_days={}),
    "is there twice": lambda t: replace(t, patterns=t.patterns * 2),
    "fewer than two calls": first("patterns", stop_ids=("gate1",), offsets_s=(0,)),
    "twice running": first("patterns", stop_ids=("vend", "vend")),
    "calls at the missing stop": first("patterns", stop_ids=("vend", "lost")),
    "departures or has them out of order": first("patterns", departures_s=(2, 1)),
    "no departures": first("patterns", departures_s=()),
    "not one time per call": first("patterns", offsets_s=(0,)),
    "do not run forward": first("patterns", offsets_s=(0, -1)),
    "joins a stop to itself": lambda t: replace(t, transfers=(Transfer("vend", "vend", 0, None),)),
    "names the missing stop": lambda t: replace(t, transfers=(Transfer("vend", "x", 0, None),)),
    "takes -5 s": lambda t: replace(t, transfers=(Transfer("vend", "tams", 0, -5),)),
    "shape up is missing": lambda t: replace(t, shapes={}),
    "shape x is not used": lambda t: replace(t, shapes={**t.shapes, "x": t.shapes["up"]}),
    "has the form": lambda t: replace(t, shapes={"up": np.zeros((1, 2))}),
    "leaves the Earth": lambda t: replace(t, shapes={"up": np.full((2, 2), np.inf)}),
    "listed as left out": lambda t: replace(t, left_out=(LeftOut("route", "t1", "why"),)),
    "without a reason": lambda t: replace(t, left_out=(LeftOut("route", "x", ""),)),
}


def test_a_sound_timetable_has_no_faults(read_town):
    assert faults(read_town()) == ()


@pytest.mark.parametrize("told", BREAKS)
def test_every_fault_is_found(read_town, told):
    broken = BREAKS[told](read_town())
    assert any(told in fault for fault in faults(broken)), faults(broken)
