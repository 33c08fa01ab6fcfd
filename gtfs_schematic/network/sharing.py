"""Find the stretches along which one course runs in the street of another."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from gtfs_schematic.geometry import Point
from gtfs_schematic.network.model import NetworkSettings
from gtfs_schematic.network.tracks import Course, samples

_SAMPLE_M = 10.0
"""Distance of the points by which courses are compared: small against the width of a street."""
_TANGENT_M = 15.0
"""Directions are taken over this length to either side, metres."""
_CORNER = 2.5
"""Two courses that turn off at one corner may point apart for this many times `alongside_m`."""
_JUMP = 3.0
"""Where a course goes on so many times as far on the other as on itself, it has changed over."""
_PART_M = 12.0
"""Courses that fork have parted once they are so much further apart than they were, metres."""


@dataclass(frozen=True, eq=False)
class Street:
    """A course with what comparisons need, computed once."""

    points: Course
    """Points along the course, close together."""

    @classmethod
    def of(cls, course: Course) -> Street:
        """Sample a course."""
        return cls(samples(course, _SAMPLE_M))

    @cached_property
    def tree(self) -> cKDTree:
        """Finds the nearest of `points`."""
        return cKDTree(self.points)

    @cached_property
    def along(self) -> NDArray[np.float64]:
        """Distances of `points` from the start along the course, metres."""
        steps = np.hypot(*np.diff(self.points, axis=0).T)
        return np.concatenate([[0.0], np.cumsum(steps)])

    @property
    def length(self) -> float:
        """Length of the course, metres."""
        return float(self.along[-1])

    @cached_property
    def headings(self) -> Course:
        """Unit vectors along the course at `points`, shape (n, 2)."""
        back, on = self._at(self.along - _TANGENT_M), self._at(self.along + _TANGENT_M)
        length = np.maximum(np.hypot(*(on - back).T), 1e-9)
        return np.asarray((on - back) / length[:, None])

    def place(self, along: float) -> Point:
        """Give the point so far from the start."""
        x, y = self._at(np.array([along]))[0]
        return float(x), float(y)

    def between(self, start: float, end: float) -> Street:
        """Give the part from one distance to another; backwards if the first is the greater."""
        low, high = sorted((start, end))
        inner = self.points[(self.along > low) & (self.along < high)]
        part = np.vstack([self._at(np.array([low])), inner, self._at(np.array([high]))])
        return Street(part if start <= end else part[::-1])

    def _at(self, along: NDArray[np.float64]) -> Course:
        return np.column_stack([np.interp(along, self.along, axis) for axis in self.points.T])


@dataclass(frozen=True, slots=True)
class Stretch:
    """Where a course runs along another: distances from the start of either, metres."""

    start: float
    end: float
    other_start: float
    """At `start`; greater than `other_end` where the two run against each other."""
    other_end: float

    @property
    def length(self) -> float:
        """Length along the first course, metres."""
        return self.end - self.start

    def reversed(self) -> Stretch:
        """Give the same stretch from its end; `start` is then the greater."""
        return Stretch(self.end, self.start, self.other_end, self.other_start)

    def inward(self, by_m: float) -> tuple[float, float]:
        """Give the places along both that are so far inside its start."""
        own = math.copysign(by_m, self.end - self.start)
        other = math.copysign(by_m, self.other_end - self.other_start)
        return self.start + own, self.other_start + other


@dataclass(frozen=True, slots=True)
class Sharing:
    """The tolerances within which two courses are in one street."""

    near_m: float
    cosine: float
    least_m: float

    @classmethod
    def by(cls, settings: NetworkSettings) -> Sharing:
        """Take the tolerances of the settings."""
        cosine = math.cos(math.radians(settings.alongside_deg))
        return cls(settings.alongside_m, cosine, settings.alongside_min_m)

    def stretches(self, street: Street, other: Street) -> list[Stretch]:
        """Give the stretches of a course on which it runs along another, in order.

        1. Every point is near a point of the other, and heads along it, either way round; it may
           head across for as long as a corner takes.
        2. It goes on along the other as it goes on itself, without jumps.
        3. It starts and ends heading along, and before the two have parted.
        """
        gaps, nearest = other.tree.query(street.points)
        near = gaps <= self.near_m
        cosines = np.abs((other.headings[nearest] * street.headings).sum(axis=1))
        along = near & (cosines >= self.cosine)
        found = []
        place = other.along[nearest]
        jumps = np.abs(np.diff(place)) > _JUMP * np.diff(street.along) + self.near_m
        breaks = np.flatnonzero(jumps) + 1
        for first, last in _runs(near, breaks):
            for start, end in self._parallel(along, street, first, last):
                low, high = self._trimmed(gaps, place, start, end)
                if high > low:
                    found.append(
                        Stretch(
                            float(street.along[low]),
                            float(street.along[high]),
                            float(place[low]),
                            float(place[high]),
                        )
                    )
        return found

    def _parallel(
        self, along: NDArray[np.bool_], street: Street, first: int, last: int
    ) -> Iterator[tuple[int, int]]:
        """Split a run of near points where it heads across for longer than a corner takes."""
        heading = first + np.flatnonzero(along[first : last + 1])
        if not len(heading):
            return
        apart = np.diff(street.along[heading]) > _CORNER * self.near_m
        for part in np.split(heading, np.flatnonzero(apart) + 1):
            yield int(part[0]), int(part[-1])

    def _trimmed(
        self, gaps: NDArray[np.float64], place: NDArray[np.float64], first: int, last: int
    ) -> tuple[int, int]:
        """Cut ends at which the two have parted, or the other has come to its end."""
        limit = float(np.median(gaps[first : last + 1])) + _PART_M
        inside = first + np.flatnonzero(gaps[first : last + 1] <= limit)
        low, high = int(inside[0]), int(inside[-1])
        while low < high and place[low + 1] == place[low]:
            low += 1
        while low < high and place[high - 1] == place[high]:
            high -= 1
        return low, high


def _runs(mask: NDArray[np.bool_], breaks: NDArray[np.int64]) -> Iterator[tuple[int, int]]:
    """Give first and last index of every run of True, cut before each of the breaks."""
    edges = np.flatnonzero(np.diff(np.concatenate([[False], mask, [False]])))
    for start, stop in zip(edges[::2], edges[1::2], strict=True):
        inner = breaks[(breaks > start) & (breaks < stop)]
        cuts = [int(start), *(int(b) for b in inner), int(stop)]
        for low, high in itertools.pairwise(cuts):
            yield low, high - 1
