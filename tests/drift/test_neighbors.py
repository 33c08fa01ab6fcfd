"""Neighbourhoods are compared as scikit-learn does, and as a slow count does."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import pearsonr, spearmanr
from sklearn.manifold import trustworthiness

from gtfs_schematic.drift.neighbors import neighborhood
from gtfs_schematic.drift.pairs import octant_agreement, pair_distances, pearson, spearman

seeds = st.integers(0, 2**32 - 1)


def cloud(seed: int, n: int = 40) -> np.ndarray:
    rng = np.random.default_rng(seed)
    return rng.normal(size=n) + 1j * rng.normal(size=n)


def columns(points: np.ndarray) -> np.ndarray:
    return np.column_stack([points.real, points.imag])


@given(seeds, st.integers(1, 12), st.floats(0.0, 3.0))
def test_trustworthiness_and_continuity_are_those_of_scikit_learn(seed, k, noise):
    ground = cloud(seed)
    sheet = ground + noise * cloud(seed + 1)
    ours = neighborhood(ground, sheet, k)
    true, drawn = columns(ground), columns(sheet)
    assert ours.trustworthiness == pytest.approx(trustworthiness(true, drawn, n_neighbors=k))
    # Continuity is trustworthiness with ground and sheet changed about.
    assert ours.continuity == pytest.approx(trustworthiness(drawn, true, n_neighbors=k))


@given(seeds, st.integers(1, 8))
def test_agreement_is_what_a_slow_count_gives(seed, k):
    ground, sheet = cloud(seed, 20), cloud(seed + 1, 20)
    shared = 0
    for i in range(20):
        others = [j for j in range(20) if j != i]
        near, seen = (
            set(sorted(others, key=lambda j: abs(p[j] - p[i]))[:k]) for p in (ground, sheet)
        )
        shared += len(near & seen)
    assert neighborhood(ground, sheet, k).agreement == pytest.approx(shared / (20 * k))


def test_a_similarity_image_keeps_all_neighbours():
    ground = cloud(1)
    whole = neighborhood(ground, 3j * ground + 5, 5)
    assert (whole.agreement, whole.trustworthiness, whole.continuity) == (1.0, 1.0, 1.0)


def test_chance_keeps_few():
    """Shuffled stations share k / (n - 1) of their neighbours on average."""
    found = [neighborhood(cloud(i, 60), cloud(i + 500, 60), 5).agreement for i in range(40)]
    assert np.mean(found) == pytest.approx(5 / 59, abs=0.02)


@pytest.mark.parametrize("n", [1, 2])
def test_two_stations_have_no_neighbourhood(n):
    assert neighborhood(cloud(1, n), cloud(2, n), 5).agreement == 1.0


@given(seeds)
def test_correlations_are_those_of_scipy(seed):
    ground, sheet = cloud(seed, 25), cloud(seed, 25) + 0.5 * cloud(seed + 1, 25)
    true, drawn = pair_distances(ground, sheet)
    assert len(true) == 25 * 24 / 2
    assert pearson(true, drawn) == pytest.approx(pearsonr(true, drawn)[0])
    assert spearman(true, drawn) == pytest.approx(spearmanr(true, drawn)[0])


def test_ranks_share_their_mean_where_they_tie():
    a, b = np.array([1.0, 2.0, 2.0, 3.0]), np.array([1.0, 3.0, 2.0, 2.0])
    assert spearman(a, b) == pytest.approx(spearmanr(a, b)[0])


# By hand: every pair of a map turned by an octant is seen one octant off; by less than half of
# one, pairs on the compass points stay.
@pytest.mark.parametrize(("turn", "share"), [(0, 1.0), (20, 1.0), (25, 0.0), (45, 0.0), (360, 1.0)])
def test_octants_of_a_cross(turn, share):
    cross = np.array([0, 1, 1j, -1, -1j])
    drawn = cross * np.exp(1j * np.radians(turn))
    assert octant_agreement(cross, drawn) == share


def test_octants_of_a_mirror_image():
    """Of the pairs of a square, mirrored, the sides across flip and the sides along stay."""
    square = np.array([0, 1, 1 + 1j, 1j])
    assert octant_agreement(square, -np.conj(square)) == pytest.approx(2 / 6)
