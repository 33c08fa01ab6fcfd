"""Tell where one pattern runs along another: near enough, in the same direction, long enough."""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.geometry import Point
from gtfs_schematic.network.links import Pair
from gtfs_schematic.network.model import NetworkSettings
from gtfs_schematic.network.sharing import Street
from gtfs_schematic.network.tracks import Course, Track, samples

_CORNER = 2.5
"""Two courses that turn off at one corner may point apart for this many times `near_m` before
they have parted, or after they have met."""


@dataclass(frozen=True, eq=False)
class Run:
    """One pattern, or a part of it, with what comparisons need, computed once."""

    stations: tuple[str, ...]
    sections: tuple[Course, ...]
    way: str
    """The kind of way that it runs on."""

    @classmethod
    def of(cls, track: Track, way: str) -> Run:
        """Make a run of a whole pattern."""
        return cls(track.calling.stations, track.sections, way)

    @cached_property
    def line(self) -> shapely.LineString:
        """The course."""
        line = shapely.linestrings(np.vstack(self.sections))
        shapely.prepare(line)
        return line

    @cached_property
    def street(self) -> Street:
        """The course as points close together, with distances and headings."""
        return Street(samples(np.vstack(self.sections)))

    @cached_property
    def dots(self) -> NDArray[np.object_]:
        """The same points as geometries."""
        return np.asarray(shapely.points(self.street.points))

    @cached_property
    def called(self) -> frozenset[str]:
        """Ids of the stations at which it calls."""
        return frozenset(self.stations)

    @cached_property
    def steps(self) -> tuple[tuple[Pair, Course], ...]:
        """Pairs of stations called at one after the other, with the course between."""
        return tuple(zip(itertools.pairwise(self.stations), self.sections, strict=True))


@dataclass(frozen=True)
class Alongside:
    """Measures how far runs go together; remembers what it has measured."""

    near_m: float
    cosine: float
    """Least cosine between two courses that run along each other, either way round."""
    least_m: float
    _seen: dict[tuple[int, int], tuple[NDArray[np.bool_], NDArray[np.bool_]]] = field(
        default_factory=dict
    )
    _kept: list[Run] = field(default_factory=list)
    """Runs that were measured stay alive, so that nothing else takes their identity."""

    @classmethod
    def by(cls, settings: NetworkSettings) -> Alongside:
        """Make one with the tolerances of the settings."""
        cosine = math.cos(math.radians(settings.alongside_deg))
        return cls(settings.alongside_m, cosine, settings.alongside_min_m)

    def together(
        self,
        run: Run,
        step: shapely.LineString,
        other: Run,
        place: Point,
        also: Sequence[Point] = (),
    ) -> bool:
        """Tell whether `other` runs along `run` at a place of its own, for long enough.

        Parameters
        ----------
        run, other
            The two.
        step
            The part of `run` that must be near the place.
        place
            Where `other` must lie along `run`, local metres; its nearest point counts.
        also
            Further places that the stretch about `place` must reach.
        """
        near, along = self._compared(run, other)
        middle = _nearest(other.street.points, place)
        if not near[middle] or not shapely.dwithin(step, other.dots[middle], self.near_m):
            return False
        outside = np.flatnonzero(~near)
        first = int(outside[outside < middle].max(initial=-1)) + 1
        last = int(outside[outside > middle].min(initial=len(near))) - 1
        steps = np.diff(other.street.along[first : last + 1])
        parallel = along[first:last] & along[first + 1 : last + 1]
        return bool(
            parallel.any()
            and steps[parallel].sum() >= self.least_m
            and all(first <= _nearest(other.street.points, p) <= last for p in also)
        )

    def _compared(self, run: Run, other: Run) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
        """Which points of `other` are near `run`, and which of these head along it.

        Where it heads across for longer than a corner takes, it is not near.
        """
        key = (id(run), id(other))
        if key not in self._seen:
            self._kept.extend((run, other))
            near = np.asarray(shapely.dwithin(run.line, other.dots, self.near_m))
            along = np.zeros_like(near)
            if near.any():
                _, nearest = run.street.tree.query(other.street.points[near])
                cosines = np.abs(
                    (run.street.headings[nearest] * other.street.headings[near]).sum(axis=1)
                )
                along[near] = cosines >= self.cosine
            self._seen[key] = near & ~self._long(near & ~along, other), along
        return self._seen[key]

    def _long(self, across: NDArray[np.bool_], other: Run) -> NDArray[np.bool_]:
        """Keep the stretches that are longer than two courses through one corner need."""
        kept = np.zeros_like(across)
        edges = np.flatnonzero(np.diff(np.concatenate([[False], across, [False]])))
        for start, stop in zip(edges[::2], edges[1::2], strict=True):
            length = other.street.along[stop - 1] - other.street.along[start]
            kept[start:stop] = length > _CORNER * self.near_m
        return kept


def _nearest(points: Course, place: Point) -> int:
    return int(np.argmin(np.hypot(points[:, 0] - place[0], points[:, 1] - place[1])))
