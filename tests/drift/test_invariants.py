"""What must hold for every drawing: no frame of reference matters, and a true map has no drift."""

from __future__ import annotations

import cmath
import math
from dataclasses import replace

import numpy as np
import pytest
import small_diagrams
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from scipy.linalg import orthogonal_procrustes
from small_diagrams import Drawn, Rail, Stop

from gtfs_schematic.drift.check import faults
from gtfs_schematic.drift.fit import centred, free_fit
from gtfs_schematic.drift.measure import measure, measure_edition
from gtfs_schematic.drift.warp import AffineField, local_scales

seeds = st.integers(0, 2**32 - 1)
few = settings(max_examples=30)
"""Each example is measured whole."""


def drawing(seed: int, n: int = 14) -> tuple[list[Stop], list[Rail]]:
    """Draw random stations within 5 km roughly where they lie, in a chain with some chords."""
    rng = np.random.default_rng(seed)
    x, y = rng.uniform(-5000, 5000, (2, n)).round(1)
    u, v = rng.normal(0, 12, (2, n))
    stops = [Stop(f"s{i}", x[i], y[i], x[i] / 100 + u[i], -y[i] / 100 + v[i]) for i in range(n)]
    ends = [(i, i + 1) for i in range(n - 1)] + [(i, i + 5) for i in range(0, n - 5, 3)]
    rails = [small_diagrams.rail(f"{a}-{b}", stops[a], stops[b], "1") for a, b in ends]
    return stops, rails


def redrawn(stops: list[Stop], factor: complex, shift: complex) -> list[Stop]:
    """Turn, scale and shift the drawing, y up."""
    moved = [complex(s.x_mm, -s.y_mm) * factor + shift for s in stops]
    return [replace(s, x_mm=w.real, y_mm=-w.imag) for s, w in zip(stops, moved, strict=True)]


def shape(report) -> list[float]:
    """Gather what must not depend on the frame of the drawing, rotation included."""
    figures = report.summary
    return [
        report.free.residual,
        figures.log_length_sd,
        figures.distance_correlation,
        figures.distance_rank_correlation,
        figures.neighbor_agreement,
        figures.trustworthiness,
        figures.continuity,
        *(link.length_ratio for link in report.links),
        *(station.local_scale for station in report.stations),
    ]


@few
@given(seeds, st.floats(0.05, 20.0), st.floats(-180.0, 180.0), st.floats(-500, 500))
def test_turning_scaling_and_shifting_the_drawing_changes_no_shape(seed, scale, turn, shift):
    stops, rails = drawing(seed)
    factor = cmath.rect(scale, math.radians(turn))
    one, two = measure(stops, rails), measure(redrawn(stops, factor, shift * (1 - 2j)), rails)
    assert shape(two) == pytest.approx(shape(one), rel=1e-6, abs=1e-9)
    turned = two.free.rotation_deg - one.free.rotation_deg - turn
    assert math.remainder(turned, 360.0) == pytest.approx(0.0, abs=1e-6)


@few
@given(seeds, st.floats(0.05, 20.0), st.floats(-500, 500))
def test_scaling_and_shifting_changes_no_displacement(seed, scale, shift):
    stops, rails = drawing(seed)
    one, two = measure(stops, rails), measure(redrawn(stops, scale, shift * (2 + 1j)), rails)
    for a, b in zip(one.stations, two.stations, strict=True):
        assert b.displacement_m == pytest.approx(a.displacement_m, rel=1e-6, abs=1e-4)
    for c, d in zip(one.links, two.links, strict=True):
        assert d.bearing_change_deg == pytest.approx(c.bearing_change_deg, abs=1e-6)
    assert two.summary.order_flips == one.summary.order_flips
    assert two.summary.octant_agreement == one.summary.octant_agreement


@few
@given(seeds)
def test_a_similarity_image_has_no_drift(seed):
    """Distances on the ground are projected, so they differ from the plane's by some 1e-7."""
    stops, rails = drawing(seed)
    true = [replace(s, x_mm=s.x_m / 50, y_mm=-s.y_m / 50) for s in stops]
    report = measure(true, rails)
    assert report.north_up.residual == pytest.approx(0.0, abs=1e-4)
    assert report.summary.displacement_max_share < 0.01
    assert report.summary.octant_agreement > 0.9
    assert report.summary.bearing_over_22_5 == 0.0
    assert report.summary.neighbor_agreement > 0.9
    assert report.competing == report.false_neighbors == report.hidden_walks == ()


@few
@given(seeds)
def test_nothing_is_negative_or_beyond_its_range(seed):
    stops, rails = drawing(seed)
    report = measure_edition(
        Drawn(tuple(stops), tuple(rails), (), (small_diagrams.Named("1", "1"),))
    )
    figures = report.summary
    shares = [
        report.north_up.residual,
        report.free.residual,
        figures.bearing_over_22_5,
        figures.order_flips,
        figures.octant_agreement,
        figures.neighbor_agreement,
        figures.trustworthiness,
        figures.continuity,
    ]
    assert all(0.0 <= share <= 1.0 for share in shares)
    assert all(0.0 <= s.direction_deg < 360.0 <= 360.0 + s.displacement_m for s in report.stations)
    assert all(-180.0 < k.bearing_change_deg <= 180.0 and k.length_ratio > 0 for k in report.links)
    assert faults(report) == ()


@given(seeds, seeds)
def test_symmetric_measures_do_not_ask_which_is_the_ground(one, two):
    """Residual and correlation of z with w are those of w with z."""
    stops, _ = drawing(one)
    others, _ = drawing(two)
    z, w = (np.array([complex(s.x_m, s.y_m) for s in part]) for part in (stops, others))
    assert free_fit(z, w).residual == pytest.approx(free_fit(w, z).residual, abs=1e-12)


@given(seeds)
def test_the_free_rotation_is_that_of_orthogonal_procrustes(seed):
    stops, _ = drawing(seed)
    z = centred(np.array([complex(s.x_m, s.y_m) for s in stops]))
    w = centred(np.array([complex(s.x_mm, -s.y_mm) for s in stops]))
    a, b = (np.column_stack([p.real, p.imag]) for p in (z, w))
    best, size = orthogonal_procrustes(a, b)
    assume(np.linalg.det(best) > 0)  # scipy allows reflections, the fit does not
    fit = free_fit(z, w)
    # Rows are multiplied from the left, so the matrix is that of the turn, transposed.
    assert math.radians(fit.rotation_deg) == pytest.approx(math.atan2(best[0, 1], best[0, 0]))
    assert fit.scale_mm_per_km / 1000 == pytest.approx(size / np.sum(np.abs(z) ** 2))


@given(seeds, st.floats(0.2, 5.0), st.floats(-80.0, 80.0), st.floats(-1.0, 1.0))
def test_the_local_field_of_an_affine_map_is_that_map(seed, stretch, turn, shear):
    """Up to the pull to the whole drawing's similarity, a twentieth of the weights."""
    stops, _ = drawing(seed, 60)
    z = np.array([complex(s.x_m, s.y_m) for s in stops])
    angle = math.radians(turn)
    rotation = np.array([[math.cos(angle), -math.sin(angle)], [math.sin(angle), math.cos(angle)]])
    matrix = rotation @ np.array([[stretch, shear], [0.0, 1.0]])
    moved = matrix @ np.vstack([z.real, z.imag])
    field = AffineField(z, moved[0] + 1j * moved[1])
    size, turned = local_scales(field)
    nearest = math.atan2(matrix[1, 0] - matrix[0, 1], matrix[0, 0] + matrix[1, 1])
    middle = np.argsort(np.abs(z - z.mean()))[:10]
    expected = math.sqrt(abs(np.linalg.det(matrix))) / abs(field.whole)
    assert size[middle] == pytest.approx(expected, rel=0.2)
    assert turned[middle] == pytest.approx(-math.degrees(nearest), abs=12.0)


@given(seeds, st.floats(-170.0, 170.0))
def test_the_local_field_of_a_similarity_is_the_same_everywhere(seed, turn):
    stops, _ = drawing(seed)
    z = np.array([complex(s.x_m, s.y_m) for s in stops])
    size, turned = local_scales(AffineField(z, z * cmath.rect(0.02, math.radians(turn)) + 9))
    assert size == pytest.approx(1.0, abs=1e-9)
    assert turned == pytest.approx(-turn, abs=1e-6)


def test_the_grid_of_a_true_map_stays_square():
    stops, rails = drawing(3)
    true = [replace(s, x_mm=s.x_m / 50, y_mm=-s.y_m / 50) for s in stops]
    warp = measure(true, rails).warp
    assert len(warp.near) == warp.columns * warp.rows
    assert any(warp.near)
    for a, b in zip(warp.true_mm, warp.drawn_mm, strict=True):
        assert math.dist(a, b) < 1.0  # of 200 mm: the earth is no plane
