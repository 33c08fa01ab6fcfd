"""The check of the bundles room finds what is spoilt."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import drawn_networks
import pytest

from gtfs_schematic.bundles.build import bundle
from gtfs_schematic.bundles.check import count_order, faults
from gtfs_schematic.bundles.model import BundledLayout, BundleSettings, Corner, StationSpan

Corners = tuple[Corner, ...]


@pytest.fixture(scope="module")
def good() -> BundledLayout:
    return bundle(drawn_networks.ribbon(), BundleSettings())


def _found(bundled: BundledLayout, word: str) -> list[str]:
    return [fault for fault in faults(bundled) if word in fault]


def test_sound_bundle_has_no_fault(good):
    assert faults(good) == ()


def test_recount_agrees_with_brute_force(good, brute_force):
    force = brute_force(good.layout)
    spoilt = {link: order[::-1] for link, order in good.orders.items()} | {
        "m2-m3": good.orders["m2-m3"]
    }
    expected = (force.crossings(spoilt), force.separations(spoilt))
    assert expected[0] > 0
    assert count_order(good.layout, spoilt) == expected


def test_line_missing_from_an_order(good):
    spoilt = replace(good, orders={**good.orders, "m1-m2": ("1", "2", "3", "3")})
    assert _found(spoilt, "link m1-m2")


def test_stretch_left_out_or_drawn_twice(good):
    assert _found(replace(good, stretches=(*good.stretches, good.stretches[0])), "drawn 2 times")
    assert _found(replace(good, stretches=good.stretches[1:]), "drawn 0 times")


def test_wrong_quality(good):
    quality = replace(good.quality, crossings=good.quality.crossings + 1)
    assert _found(replace(good, quality=quality), "is claimed")


def test_bound_above_the_count(good):
    quality = replace(good.quality, crossings_bound=99)
    assert _found(replace(good, quality=quality), "bound")


def _with_first(good: BundledLayout, change: Callable[[Corners], Corners]) -> BundledLayout:
    first, *rest = good.stretches
    return replace(good, stretches=(replace(first, corners=change(first.corners)), *rest))


def test_radius_too_large(good):
    def swell(corners: Corners) -> Corners:
        return tuple(Corner(c.at_mm, 40.0 * c.radius_mm) for c in corners)

    assert _found(_with_first(good, swell), "do not fit")


def test_rounded_end(good):
    assert _found(_with_first(good, lambda c: (Corner(c[0].at_mm, 1.0), *c[1:])), "rounded end")


def test_line_drawn_beside_its_slot(good):
    def push(corners: Corners) -> Corners:
        return tuple(Corner((c.at_mm[0] + 0.4, c.at_mm[1] + 0.4), c.radius_mm) for c in corners)

    assert _found(_with_first(good, push), "nowhere beside")


def test_order_and_drawing_disagree(good):
    orders = {**good.orders, "m3-m4": good.orders["m3-m4"][::-1]}
    assert _found(replace(good, orders=orders), "is claimed")


def test_lines_drawn_in_each_others_place(good):
    swap = {"2": "4", "4": "2"}
    stretches = tuple(
        replace(s, line_id=swap.get(s.line_id, s.line_id), link_ids=links)
        for s, links in (
            (s, next(t.link_ids for t in good.stretches if t.line_id == swap[s.line_id]))
            if s.line_id in swap
            else (s, s.link_ids)
            for s in good.stretches
        )
    )
    assert _found(replace(good, stretches=stretches), "nowhere beside")


def test_station_without_span(good):
    spans = {k: span for k, span in good.spans.items() if k != "m3"}
    assert _found(replace(good, spans=spans), "no span")


def test_span_off_its_lines(good):
    spans = {**good.spans, "m3": StationSpan("m3", ((0.0, 0.0),))}
    assert _found(replace(good, spans=spans), "mm off")
