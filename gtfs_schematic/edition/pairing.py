"""Choose which pairs are matches, so that together they are likeliest."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Mapping

import numpy as np
from scipy.optimize import linear_sum_assignment
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

Pair = tuple[int, int]


def best_pairs(odds: Mapping[Pair, float]) -> dict[Pair, float]:
    """Choose pairs that use each row and each column at most once, of greatest total.

    Jaro (1989, "Advances in Record-Linkage Methodology") links records so; the assignment itself
    is scipy's (Crouse 2016), on each connected part alone.

    Parameters
    ----------
    odds
        Per (row, column) the logarithm of the odds that they are one; pairs at or below nought
        are never chosen.

    Returns
    -------
    dict
        Per chosen pair how sure it is, 0 … 1: its share of what speaks for any pair with its row,
        or with its column if that is less, where being without a partner has odds of one.
    """
    good = {pair: value for pair, value in sorted(odds.items()) if value > 0.0}
    if not good:
        return {}
    chosen = [pair for part in _parts(good) for pair in _assigned(part, good)]
    by_row, by_column = _sums(odds, 0), _sums(odds, 1)
    return {
        pair: min(_share(good[pair], by_row[pair[0]]), _share(good[pair], by_column[pair[1]]))
        for pair in sorted(chosen)
    }


def _parts(good: Mapping[Pair, float]) -> list[list[Pair]]:
    """Part pairs so that none shares a row or column with a pair of another part."""
    rows = np.array([i for i, _ in good])
    columns = np.array([j for _, j in good])
    height, width = int(rows.max()) + 1, int(columns.max()) + 1
    size = height + width
    graph = coo_array((np.ones(len(good)), (rows, height + columns)), shape=(size, size))
    _, labels = connected_components(graph, directed=False)
    parts: dict[int, list[Pair]] = defaultdict(list)
    for pair in good:
        parts[int(labels[pair[0]])].append(pair)
    return [parts[label] for label in sorted(parts)]


def _assigned(part: list[Pair], good: Mapping[Pair, float]) -> list[Pair]:
    if len(part) == 1:
        return part
    rows = sorted({i for i, _ in part})
    columns = sorted({j for _, j in part})
    at_row = {key: n for n, key in enumerate(rows)}
    at_column = {key: n for n, key in enumerate(columns)}
    matrix = np.zeros((len(rows), len(columns)))
    for i, j in part:
        matrix[at_row[i], at_column[j]] = good[i, j]
    found = zip(
        *(ids.tolist() for ids in linear_sum_assignment(matrix, maximize=True)), strict=True
    )
    pairs = ((rows[i], columns[j]) for i, j in found)
    return [pair for pair in pairs if pair in good]


def _sums(odds: Mapping[Pair, float], side: int) -> dict[int, float]:
    """Per row (0) or column (1) the logarithm of the sum of all odds, and of one for no partner."""
    groups: dict[int, list[float]] = defaultdict(list)
    for pair in sorted(odds):
        groups[pair[side]].append(odds[pair])
    sums = {}
    for key, values in groups.items():
        top = max(0.0, *values)
        sums[key] = top + math.log(math.exp(-top) + math.fsum(math.exp(v - top) for v in values))
    return sums


def _share(value: float, whole: float) -> float:
    return math.exp(value - whole)
