"""Sparse constraint rows of a linear programme, gathered block by block."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray


class Rows:
    """Sparse rows that grow in blocks."""

    def __init__(self) -> None:
        self.rows: list[NDArray[np.int64]] = []
        self.columns: list[NDArray[np.int64]] = []
        self.values: list[NDArray[np.float64]] = []
        self.right: list[NDArray[np.float64]] = []
        self.count = 0

    def add(
        self,
        terms: Sequence[tuple[NDArray[np.int64], NDArray[np.float64] | float]],
        right: NDArray[np.float64] | float,
    ) -> None:
        """Add one row per entry of the column arrays: Σ value · x[column] ≤ or = right."""
        size = len(terms[0][0])
        row = np.arange(self.count, self.count + size)
        for columns, values in terms:
            self.rows.append(row)
            self.columns.append(np.asarray(columns, dtype=np.int64))
            self.values.append(np.broadcast_to(np.asarray(values, dtype=np.float64), size))
        self.right.append(np.broadcast_to(np.asarray(right, dtype=np.float64), size))
        self.count += size

    def add_one(
        self, columns: NDArray[np.int64], values: NDArray[np.float64], right: float = 0.0
    ) -> None:
        """Add one row: Σ value · x[column] ≤ or = right."""
        self.rows.append(np.full(len(columns), self.count))
        self.columns.append(np.asarray(columns, dtype=np.int64))
        self.values.append(np.asarray(values, dtype=np.float64))
        self.right.append(np.array([right]))
        self.count += 1

    def matrix(self, width: int) -> tuple[sp.csc_matrix, NDArray[np.float64]]:
        """Give the matrix and the right-hand side."""
        if not self.count:
            return sp.csc_matrix((0, width)), np.zeros(0)
        entries = (
            np.concatenate(self.values),
            (np.concatenate(self.rows), np.concatenate(self.columns)),
        )
        matrix = sp.csc_matrix(entries, shape=(self.count, width))
        return matrix, np.concatenate(self.right)
