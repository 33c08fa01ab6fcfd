"""Measure how long the layout takes as networks grow, and what the knob of fidelity does.

    PYTHONPATH=tests python tests/benchmarks/layout_speed.py --out FOLDER

For every kind of `sized_networks` asked for, and every size, a network is laid out at the efforts
`quick` and `standard` (`place` and `fit_sheet` timed apart, best of `--repeats`), after one small
run that compiles. Printed: seconds of the processor and by the clock, the exponent b of processor
seconds ~ stations^b by least squares on logarithms (goal: at most 1.3), and the ratio of standard
to quick (goal: at least 4).

Then, for the feeds and generated networks of `--knob-stations`, at five fidelities: bends per line,
mean turn of a bend, variation of link lengths (standard deviation by mean) and drift (the share of
the variance of the drawn places that no similarity of the ground explains, 0 to 1). Goal: drift
falls and variation rises all along.

Tables and plots: speed.csv, knob.csv, speed.png, knob.png. The plots need the extra `benchmark`.
"""
# ruff: noqa: T201 - a script's results go to standard output

from __future__ import annotations

import argparse
import csv
import itertools
import math
import time
from collections.abc import Sequence
from dataclasses import astuple, dataclass, fields
from pathlib import Path
from typing import Any

import numpy as np
from layout_guarantees import CLEARANCES, FRAMES
from sized_networks import KINDS

from gtfs_schematic.feed.model import FeedSettings
from gtfs_schematic.feed.read import read_feed
from gtfs_schematic.layout.engine import fit_sheet, place
from gtfs_schematic.layout.ground import project
from gtfs_schematic.layout.model import Layout, LayoutSettings
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.model import Network, NetworkSettings

EFFORTS = ("quick", "standard")
FIDELITIES = (0.0, 0.25, 0.5, 0.75, 1.0)


@dataclass(frozen=True)
class Timing:
    """Seconds that one network took."""

    kind: str
    stations: int
    links: int
    effort: str
    place_s: float
    """Seconds of the processor for `place`."""
    fit_s: float
    """Seconds of the processor for `fit_sheet`."""
    clock_s: float
    """Seconds by the clock for both: more where others use the machine."""

    @property
    def all_s(self) -> float:
        """Seconds of the processor in all."""
        return self.place_s + self.fit_s


@dataclass(frozen=True)
class Knob:
    """What one fidelity makes of one network."""

    network: str
    fidelity: float
    bends_per_line: float
    turn_deg: float
    """Mean turn of a bend; not a number where no line bends."""
    length_variation: float
    drift: float


def timed(network: Network, kind: str, effort: str, repeats: int) -> Timing:
    """Lay a network out several times; give the shortest times."""
    settings = LayoutSettings.model_validate({"effort": effort})
    placing, fitting, clock = [], [], []
    for _ in range(repeats):
        begun, start = time.perf_counter(), time.process_time()
        placement = place(network, settings)
        middle = time.process_time()
        fit_sheet(placement, CLEARANCES, FRAMES)
        placing.append(middle - start)
        fitting.append(time.process_time() - middle)
        clock.append(time.perf_counter() - begun)
    best = [round(min(seconds), 3) for seconds in (placing, fitting, clock)]
    return Timing(kind, len(network.stations), len(network.links), effort, *best)


def exponent(timings: Sequence[Timing]) -> float:
    """Slope of log seconds over log stations."""
    stations = np.log([t.stations for t in timings])
    return float(np.polyfit(stations, np.log([t.all_s for t in timings]), 1)[0])


def turns_of(layout: Layout) -> list[float]:
    """Give the turns of all lines along their drawn courses, degrees; a straight run gives none."""
    turns = []
    for line in layout.network.lines:
        for course in line.courses:
            points = [layout.positions[course[0]]]
            for a, b in itertools.pairwise(course):
                link = layout.network.link_between[frozenset((a, b))]
                path = layout.paths[link.id]
                points += path[1:] if link.start == a else path[-2::-1]
            steps = [math.atan2(q[1] - p[1], q[0] - p[0]) for p, q in itertools.pairwise(points)]
            turns += [
                abs(math.degrees(math.remainder(b - a, math.tau)))
                for a, b in itertools.pairwise(steps)
            ]
    return [turn for turn in turns if turn > 1.0]


def drift_of(layout: Layout) -> float:
    """Residual of the best similarity from the ground to the drawing, by complex regression."""
    stations = layout.network.stations
    ground = project([(s.lon, s.lat) for s in stations]) @ [1.0, 1.0j]
    drawn = np.array(
        [complex(layout.positions[s.id][0], -layout.positions[s.id][1]) for s in stations]
    )
    z, w = ground - ground.mean(), drawn - drawn.mean()
    return float(1.0 - abs(np.vdot(z, w)) ** 2 / (np.vdot(z, z).real * np.vdot(w, w).real))


def knob(name: str, network: Network, fidelity: float) -> Knob:
    """Lay one network out at one fidelity and measure it."""
    placement = place(network, LayoutSettings(fidelity=fidelity))
    layout = fit_sheet(placement, CLEARANCES, FRAMES)
    turns = turns_of(layout)
    lengths = [
        sum(math.dist(p, q) for p, q in itertools.pairwise(path)) for path in layout.paths.values()
    ]
    return Knob(
        name, fidelity,
        bends_per_line=round(len(turns) / len(network.lines), 3),
        turn_deg=round(float(np.mean(turns)), 2) if turns else math.nan,
        length_variation=round(float(np.std(lengths) / np.mean(lengths)), 4),
        drift=round(drift_of(layout), 5),
    )  # fmt: skip


def main() -> None:
    """Measure what was asked for; print, write and plot it."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--out", type=Path, required=True, help="folder for tables and plots")
    parser.add_argument("--sizes", type=int, nargs="*", default=[100, 250, 600, 1500, 5000])
    parser.add_argument("--kinds", nargs="+", default=sorted(KINDS), choices=sorted(KINDS))
    parser.add_argument("--repeats", type=int, default=1)
    parser.add_argument("--knob-stations", type=int, default=100)
    parser.add_argument("--knob-seeds", type=int, default=2, help="generated networks of a kind")
    parser.add_argument("--feeds", type=Path, nargs="*", default=[Path("data/before.zip")])
    asked = parser.parse_args()
    asked.out.mkdir(parents=True, exist_ok=True)
    timed(KINDS["grid"](30, 0), "grid", "quick", 1)
    timings = []
    for size, kind, effort in itertools.product(asked.sizes, asked.kinds, EFFORTS):
        timings.append(timed(KINDS[kind](size, 1), kind, effort, asked.repeats))
        print(*astuple(timings[-1]), sep="\t", flush=True)
        _write(asked.out / "speed.csv", timings)
    _print_growth(timings, asked.kinds)
    knobs = []
    networks = [(feed.stem, _network_of(feed)) for feed in asked.feeds]
    for kind, seed in itertools.product(asked.kinds, range(asked.knob_seeds)):
        networks.append((f"{kind} {seed}", KINDS[kind](asked.knob_stations, seed)))
    for (name, network), fidelity in itertools.product(networks, FIDELITIES):
        knobs.append(knob(name, network, fidelity))
        print(*astuple(knobs[-1]), sep="\t", flush=True)
        _write(asked.out / "knob.csv", knobs)
    _print_knob(knobs)
    _plot(asked.out, timings, knobs)


def _network_of(feed: Path) -> Network:
    return build_network(read_feed([feed], FeedSettings()), NetworkSettings())


def _write(path: Path, rows: Sequence[Any]) -> None:
    with path.open("w", newline="", encoding="utf-8") as file:
        table = csv.writer(file)
        table.writerow([field.name for field in fields(rows[0])])
        table.writerows(astuple(row) for row in rows)


def _print_growth(timings: Sequence[Timing], kinds: Sequence[str]) -> None:
    for kind, effort in itertools.product([*kinds, "all"], EFFORTS):
        some = [t for t in timings if kind in (t.kind, "all") and t.effort == effort]
        if len({t.stations for t in some}) > 1:
            print(f"{kind} {effort}: seconds grow as stations^{exponent(some):.2f}")
    for quick, standard in zip(timings[::2], timings[1::2], strict=True):
        ratio, improving = standard.all_s / quick.all_s, standard.place_s / quick.place_s
        print(f"{quick.kind} {quick.stations}: standard / quick {ratio:.2f}, place {improving:.2f}")


def _print_knob(knobs: Sequence[Knob]) -> None:
    for name in ("bends_per_line", "turn_deg", "length_variation", "drift") if knobs else ():
        at = [[getattr(k, name) for k in knobs if k.fidelity == f] for f in FIDELITIES]
        at = [[value for value in some if not math.isnan(value)] or [math.nan] for some in at]
        print(f"mean {name} at {FIDELITIES}:", *(f"{np.mean(some):.4f}" for some in at))
    for name, some in itertools.groupby(knobs, key=lambda k: k.network):
        row = list(some)
        falls = all(a.drift >= b.drift for a, b in itertools.pairwise(row))
        rises = all(a.length_variation <= b.length_variation for a, b in itertools.pairwise(row))
        print(f"{name}: drift falls all along: {falls}; variation rises: {rises}")


def _plot(out: Path, timings: Sequence[Timing], knobs: Sequence[Knob]) -> None:
    import matplotlib as mpl  # noqa: PLC0415 - only who plots needs it

    mpl.use("Agg")
    from matplotlib import pyplot as plt  # noqa: PLC0415 - as above

    if timings:
        figure, axes = plt.subplots()
        for kind, effort in itertools.product(sorted({t.kind for t in timings}), EFFORTS):
            some = [t for t in timings if (t.kind, t.effort) == (kind, effort)]
            style = "-o" if effort == "standard" else ":o"
            axes.loglog(
                [t.stations for t in some], [t.all_s for t in some], style, label=f"{kind} {effort}"
            )
        axes.set(xlabel="stations", ylabel="seconds, layout room")
        axes.legend(fontsize="small")
        figure.savefig(out / "speed.png", dpi=150)
    if knobs:
        figure, panels = plt.subplots(1, 3, figsize=(13, 4))
        for what, axes in zip(("drift", "length_variation", "bends_per_line"), panels, strict=True):
            for name, some in itertools.groupby(knobs, key=lambda k: k.network):
                axes.plot(FIDELITIES, [getattr(k, what) for k in some], "-o", label=name)
            axes.set(xlabel="fidelity", title=what.replace("_", " "))
        panels[-1].legend(fontsize="small", loc="upper left", bbox_to_anchor=(1.0, 1.0))
        figure.savefig(out / "knob.png", dpi=150, bbox_inches="tight")


if __name__ == "__main__":
    main()
