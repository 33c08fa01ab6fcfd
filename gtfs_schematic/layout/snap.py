"""Snap settled places to whole hundredths of a millimetre, with every direction exact."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.errors import InternalFaultError
from gtfs_schematic.layout.asked import Relative
from gtfs_schematic.layout.skeleton import STEP, Skeleton
from gtfs_schematic.lazily import lazily

if TYPE_CHECKING:
    from ortools.sat.python import cp_model
else:
    # Its import takes longer than most commands.
    cp_model = lazily("ortools.sat.python.cp_model")

UNITS_PER_MM = 100
_WINDOWS = (8, 32, 128)
_SEED = 1
_WORK = 60.0


def snap(
    skeleton: Skeleton,
    points: NDArray[np.float64],
    fixed: Collection[int] = (),
    relative: Sequence[Relative] = (),
) -> NDArray[np.int64]:
    """Find the whole-number places near `points` for which every segment keeps its direction.

    Parameters
    ----------
    skeleton
        Its segments' directions are kept exactly.
    points
        Settled places in millimetres, shape (k, 2).
    fixed
        Nodes that stay where rounding puts them.
    relative
        Places that nodes keep as seen from others.

    Returns
    -------
    NDArray
        Places in units of 1 / `UNITS_PER_MM` mm, shape (k, 2).

    Notes
    -----
    On a sum of rounded lengths a ring of diagonals need not close; a small exact search
    (CP-SAT) in a window of a few units round every place closes all of them.
    """
    near = np.rint(points * UNITS_PER_MM).astype(np.int64)
    for window in _WINDOWS:
        found = _search(skeleton, near, window, fixed, relative)
        if found is not None:
            return found
    raise InternalFaultError("No exact octilinear places were found near the settled ones.")


def _search(
    skeleton: Skeleton,
    near: NDArray[np.int64],
    window: int,
    fixed: Collection[int],
    relative: Sequence[Relative],
) -> NDArray[np.int64] | None:
    model = cp_model.CpModel()
    places = [
        [
            model.new_int_var(int(c) - reach, int(c) + reach, f"{axis}{i}")
            for axis, c in enumerate(xy)
        ]
        for i, xy in enumerate(near)
        for reach in [0 if i in fixed else window]
    ]
    for (a, b), direction in zip(skeleton.segments, skeleton.directions, strict=True):
        dx, dy = STEP[direction]
        x, y = places[b][0] - places[a][0], places[b][1] - places[a][1]
        if dx == 0:
            model.add(x == 0)
        elif dy == 0:
            model.add(y == 0)
        else:
            model.add(x == y if dx == dy else x == -y)
        model.add((x * int(dx) if dx else y * int(dy)) >= 1)
    for v, other, axis, value in relative:
        model.add(places[v][axis] - places[other][axis] == round(value * UNITS_PER_MM))
    for xy, home in zip(places, near, strict=True):
        for variable, value in zip(xy, home, strict=True):
            model.add_hint(variable, int(value))
    solver = cp_model.CpSolver()
    solver.parameters.num_workers = 1
    solver.parameters.random_seed = _SEED
    solver.parameters.max_deterministic_time = _WORK
    solver.parameters.stop_after_first_solution = True
    status = solver.solve(model)
    if status not in (cp_model.OPTIMAL, cp_model.FEASIBLE):
        return None
    return np.array([[solver.value(v) for v in xy] for xy in places], dtype=np.int64)
