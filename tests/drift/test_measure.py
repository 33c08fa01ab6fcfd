"""Drift is measured as published formulas, reference libraries and plain geometry say."""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass, replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pyproj import Geod
from scipy.spatial import procrustes

from gtfs_schematic.drift.check import faults
from gtfs_schematic.drift.fit import free_fit, north_up_fit
from gtfs_schematic.drift.measure import measure
from gtfs_schematic.drift.pairs import order_flips, pair_distances, pearson
from gtfs_schematic.errors import EditionError

SQUARE = np.array([0.0, 1.0, 1.0 + 1.0j, 1.0j])


@dataclass(frozen=True)
class Place:
    """A drawn station."""

    id: str
    name: str
    lon: float
    lat: float
    x_mm: float
    y_mm: float


@dataclass(frozen=True)
class Joined:
    """A drawn link."""

    id: str
    start: str
    end: str


def chain(places: list[Place]) -> list[Joined]:
    return [Joined(f"{a.id}-{b.id}", a.id, b.id) for a, b in itertools.pairwise(places)]


coordinates = st.floats(-50.0, 50.0).map(lambda value: round(value, 3))
points = st.lists(st.tuples(coordinates, coordinates), min_size=3, max_size=25, unique=True).map(
    lambda pairs: np.array([complex(x, y) for x, y in pairs])
)


# Closed forms for a stretched and a sheared square, computed by hand from the formula.
@pytest.mark.parametrize("a", [1.0, 1.5, 2.0, 3.0])
def test_square_stretched(a):
    stretched = a * SQUARE.real + 1j * SQUARE.imag
    assert free_fit(SQUARE, stretched).residual == pytest.approx((a - 1) ** 2 / (2 * (a * a + 1)))


@pytest.mark.parametrize(("k", "turn"), [(0.0, 0.0), (0.5, -14.036)])
def test_square_sheared(k, turn):
    sheared = SQUARE + k * SQUARE.imag
    fit = free_fit(SQUARE, sheared)
    assert fit.residual == pytest.approx(k * k / (2 * (2 + k * k)), abs=1e-12)
    assert fit.rotation_deg == pytest.approx(turn, abs=5e-4)


def test_mirror_image_is_no_likeness():
    flag = np.array([0.0, 3.0, 3.0 + 1.0j, 0.0 + 2.0j])
    assert free_fit(flag, np.conj(flag)).residual > 0.1


@given(points, st.integers(0, 2**32 - 1))
def test_free_residual_is_the_disparity_of_scipy(ground, seed):
    """Reflection is allowed in scipy, so its disparity is the better of drawing and mirror."""
    rng = np.random.default_rng(seed)
    sheet = ground + rng.normal(size=len(ground)) * 5 + 1j * rng.normal(size=len(ground)) * 5
    pair = [np.column_stack([p.real, p.imag]) for p in (ground, sheet)]
    best = min(free_fit(ground, sheet).residual, free_fit(ground, np.conj(sheet)).residual)
    assert best == pytest.approx(procrustes(*pair)[2], abs=1e-9)


@given(points, st.floats(0.01, 100.0), st.floats(-179.0, 179.0), coordinates, coordinates)
def test_free_fit_finds_the_similarity_that_was_applied(ground, scale, turn, dx, dy):
    sheet = ground * scale * np.exp(1j * math.radians(turn)) + complex(dx, dy)
    fit = free_fit(ground, sheet)
    assert fit.residual == pytest.approx(0.0, abs=1e-9)
    assert fit.scale_mm_per_km == pytest.approx(1000.0 * scale, rel=1e-9)
    assert fit.rotation_deg == pytest.approx(turn, abs=1e-6)


@given(points, st.floats(-180.0, 180.0))
def test_north_up_never_beats_the_free_fit_and_loses_by_the_turn(ground, turn):
    fit = north_up_fit(ground, ground * np.exp(1j * math.radians(turn)))
    cosine = max(math.cos(math.radians(turn)), 0.0)
    assert fit.residual == pytest.approx(1.0 - cosine**2, abs=1e-9)
    assert fit.scale_mm_per_km == pytest.approx(1000.0 * cosine, abs=1e-6)


@given(points, points)
def test_north_up_fit_is_least_squares(ground, other):
    """No other scale and shift comes closer: numpy's solver finds the same."""
    n = min(len(ground), len(other))
    z, w = ground[:n], other[:n]
    z_c, w_c = z - z.mean(), w - w.mean()
    a = np.concatenate([z_c.real, z_c.imag])[:, None]
    b = np.concatenate([w_c.real, w_c.imag])
    best = np.linalg.lstsq(a, b, rcond=None)[0][0]
    assert north_up_fit(z, w).scale_mm_per_km == pytest.approx(1000 * max(best, 0.0), abs=1e-6)


def test_order_flips_of_a_diagonal():
    """Five points on a diagonal: a swap of neighbours, a mirror image, a quarter turn."""
    diagonal = np.array([complex(i, i) for i in range(5)])
    swapped = diagonal[[1, 0, 2, 3, 4]]
    assert order_flips(diagonal, swapped) == pytest.approx(0.1)
    assert order_flips(diagonal, -np.conj(diagonal)) == pytest.approx(0.5)
    assert order_flips(diagonal, 1j * diagonal) == pytest.approx(0.5)


@given(points, points)
def test_pairs_in_blocks_equal_pairs_at_once(ground, other):
    n = min(len(ground), len(other))
    z, w = ground[:n], other[:n]
    i, j = np.triu_indices(n, 1)
    true, drawn = np.abs(z[i] - z[j]), np.abs(w[i] - w[j])
    if min(true.std(), drawn.std()) > 1e-6:
        expected = np.corrcoef(true, drawn)[0, 1]
        assert pearson(*pair_distances(z, w)) == pytest.approx(expected, abs=1e-6)


def test_blocks_meet_when_there_are_several():
    rng = np.random.default_rng(7)
    z, w = (rng.normal(size=600) + 1j * rng.normal(size=600) for _ in range(2))
    i, j = np.triu_indices(600, 1)
    expected = np.corrcoef(np.abs(z[i] - z[j]), np.abs(w[i] - w[j]))[0, 1]
    assert pearson(*pair_distances(z, w)) == pytest.approx(expected, abs=1e-9)
    flips = np.mean(
        [
            (np.sign((z[i] - z[j]).real) != np.sign((w[i] - w[j]).real)).mean(),
            (np.sign((z[i] - z[j]).imag) != np.sign((w[i] - w[j]).imag)).mean(),
        ]
    )
    assert order_flips(z, w) == pytest.approx(flips)


def grid_places(lon: float = 12.0, lat: float = 48.0, metres: float = 700.0) -> list[Place]:
    """Stations at known distances on the ground (pyproj.Geod), drawn at 10 mm per km."""
    geod = Geod(ellps="WGS84")
    places = []
    for i in range(4):
        for j in range(3):
            east, north = i * metres, j * metres
            a, b, _ = geod.fwd(
                lon, lat, math.degrees(math.atan2(east, north)), math.hypot(east, north)
            )
            places.append(
                Place(f"{i}{j}", f"Stop {i}{j}", a, b, 50 + east / 100, 200 - north / 100)
            )
    return places


def test_a_map_to_scale_has_no_drift():
    report = measure(grid_places(), chain(grid_places()))
    assert report.north_up.residual < 1e-6  # the earth is round
    assert report.north_up.scale_mm_per_km == pytest.approx(10.0, rel=1e-4)
    assert max(s.displacement_m for s in report.stations) < 1.0
    assert max(abs(k.bearing_change_deg) for k in report.links) < 0.05
    assert all(k.length_ratio == pytest.approx(1.0, abs=1e-3) for k in report.links)
    assert report.diagonal_m == pytest.approx(math.hypot(2100, 1400), rel=1e-3)
    assert report.summary.distance_correlation == pytest.approx(1.0, abs=1e-9)
    assert faults(report) == ()


def test_a_station_drawn_one_kilometre_to_the_east():
    """By hand: with n stations, one moved by d shows (n-1)/n of d, up to the change of scale."""
    places = grid_places()
    moved = [replace(p, x_mm=p.x_mm + 10.0) if p.id == "11" else p for p in places]
    report = measure(moved, chain(moved))
    drift = next(s for s in report.stations if s.station_id == "11")
    assert drift.displacement_m == pytest.approx(1000 * 11 / 12, rel=0.05)
    assert drift.direction_deg == pytest.approx(90.0, abs=5.0)
    assert drift.displacement_share == pytest.approx(drift.displacement_m / report.diagonal_m)
    assert max(report.stations, key=lambda s: s.displacement_m) is drift
    assert faults(report) == ()


def test_bearing_change_is_clockwise_and_length_ratio_relative():
    a = Place("a", "A", 0.0, 0.0, 0.0, 0.0)
    b = Place("b", "B", 0.0, 0.01, 10.0, 0.0)  # true north, drawn east: a quarter turn clockwise
    c = Place("c", "C", 0.01, 0.01, 10.0, -30.0)  # true east, drawn north: anticlockwise
    report = measure([a, b, c], chain([a, b, c]))
    first, second = report.links
    assert first.bearing_change_deg == pytest.approx(90.0, abs=0.01)
    assert second.bearing_change_deg == pytest.approx(-90.0, abs=0.01)
    assert second.length_ratio / first.length_ratio == pytest.approx(3.0, rel=0.01)


def test_reversal_is_plus_180():
    a = Place("a", "A", 0.0, 0.0, 0.0, 0.0)
    b = Place("b", "B", 0.0, 0.01, 0.0, 10.0)
    report = measure([a, b], chain([a, b]))
    assert report.links[0].bearing_change_deg == pytest.approx(180.0)
    assert (report.north_up.residual, report.north_up.scale_mm_per_km) == (1.0, 0.0)
    assert report.free.residual == pytest.approx(0.0, abs=1e-9)
    assert abs(report.free.rotation_deg) == pytest.approx(180.0)


def test_a_network_across_the_180th_meridian_keeps_together():
    here = grid_places(lon=10.0, lat=-17.0)
    there = [replace(p, lon=(p.lon + 169.99 + 180.0) % 360.0 - 180.0) for p in here]
    assert {p.lon > 0 for p in there} == {True, False}
    assert measure(there, []).diagonal_m == pytest.approx(measure(here, []).diagonal_m, rel=1e-9)


def test_link_between_stations_at_one_place_has_no_bearing():
    a = Place("a", "A", 0.0, 0.0, 0.0, 0.0)
    b = Place("b", "B", 0.0, 0.0, 10.0, 0.0)
    c = Place("c", "C", 0.01, 0.0, 20.0, 0.0)
    report = measure([a, b, c], chain([a, b, c]))
    assert (report.links[0].bearing_change_deg, report.links[0].length_ratio) == (None, None)
    assert report.links[1].length_ratio == pytest.approx(1.0)


@pytest.mark.parametrize(
    "places",
    [
        [],
        [Place("a", "A", 1.0, 2.0, 3.0, 4.0)],
        [Place("a", "A", 1.0, 2.0, 3.0, 4.0), Place("b", "B", 1.0, 2.0, 9.0, 9.0)],
        [Place("a", "A", 1.0, 2.0, 3.0, 4.0), Place("b", "B", 1.5, 2.0, 3.0, 4.0)],
    ],
    ids=["none", "one", "same ground", "same sheet"],
)
def test_nothing_to_compare_is_an_error_with_advice(places):
    with pytest.raises(EditionError, match="no two stations have different places"):
        measure(places, [])


@settings(max_examples=30)
@given(st.permutations(range(12)))
def test_order_of_stations_does_not_matter(order):
    places = [replace(p, x_mm=p.x_mm + 3 * i % 7) for i, p in enumerate(grid_places())]
    shuffled = [places[i] for i in order]
    one, two = measure(places, chain(places)), measure(shuffled, chain(places))
    assert two.north_up.residual == pytest.approx(one.north_up.residual, rel=1e-9)
    assert sorted(s.displacement_m for s in two.stations) == pytest.approx(
        sorted(s.displacement_m for s in one.stations), abs=1e-6
    )


def test_a_forged_report_is_faulted():
    report = measure(grid_places(), chain(grid_places()))
    worse = replace(report, free=replace(report.free, residual=0.5))
    assert any("worse than the north-up" in fault for fault in faults(worse))
    bent = replace(
        report, stations=(replace(report.stations[0], displacement_m=5e3), *report.stations[1:])
    )
    assert any("is not the displacement" in fault for fault in faults(bent))
