"""Compare the layout engine with the published multicriteria hill climb, criterion by criterion.

    PYTHONPATH=tests python tests/benchmarks/layout_quality.py --out FOLDER [FEED...]

Both start from the same anchors of the same plane graph (even spacing asked of both: fidelity 0
unless `--fidelity` says otherwise); both drawings are scored by `layout_criteria`, all links, with
walks left out. The wanted length is the median length of the drawing's own links, so that its
scale does not matter. Seconds are the processor's, from the network to the drawing, after a small
run that compiles both. Goal: the engine at least 20 times faster from 100 stations on, and better
or equal on every criterion. The rival's code is compiled, too, and recomputes only what a move
changes. Networks: the FEEDs (data/before.zip if none), and `sized_networks` of `--sizes`.
The table goes to quality.csv.
"""
# ruff: noqa: T201 - a script's results go to standard output

from __future__ import annotations

import argparse
import csv
import itertools
import math
import statistics
import time
from collections import Counter, defaultdict
from collections.abc import Iterator
from pathlib import Path

import numpy as np
from hill_climb import Climb, Graph, climb
from layout_criteria import (
    Drawing,
    angular_resolution,
    balanced_edge_length,
    crossings,
    edge_length,
    lengths,
    octilinearity,
    straightness,
)
from layout_guarantees import CLEARANCES, FRAMES
from sized_networks import KINDS

from gtfs_schematic.errors import SchematicError
from gtfs_schematic.feed.model import FeedSettings
from gtfs_schematic.feed.read import read_feed
from gtfs_schematic.layout.anchors import anchor_points
from gtfs_schematic.layout.engine import lay_out
from gtfs_schematic.layout.model import LayoutSettings
from gtfs_schematic.layout.planarise import planarise
from gtfs_schematic.layout.plane import PlaneGraph
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.model import Network, NetworkSettings

CRITERIA = (
    "angular resolution", "edge length", "balanced edge length", "straightness", "crossings",
    "octilinearity",
)  # fmt: skip
_EQUAL = 1e-6


def scores(drawing: Drawing, network: Network) -> dict[str, float]:
    """Score a drawing by the six criteria."""
    wanted = statistics.median(lengths(drawing).values())
    lines_on = {link.id: len(link.lines) for link in network.links}
    values = (
        angular_resolution(drawing), edge_length(drawing, wanted),
        balanced_edge_length(drawing, wanted), straightness(drawing, lines_on),
        float(crossings(drawing)), octilinearity(drawing),
    )  # fmt: skip
    return dict(zip(CRITERIA, values, strict=True))


def by_engine(network: Network, settings: LayoutSettings) -> Drawing:
    """Draw with the engine under test."""
    layout = lay_out(network, settings, CLEARANCES, FRAMES)
    return _drawing(network, dict(layout.paths))


def by_climb(network: Network, fidelity: float, how: Climb) -> tuple[Drawing, Drawing]:
    """Draw with the hill climb: straight segments between stations and crossings.

    Gives the anchors from which it starts, and where it ends.
    """
    graph = planarise(network)
    chains = _chains(graph)
    rows = Counter(_passes(network, chains))
    passes = [(v, a, b, count) for (v, a, b), count in sorted(rows.items())]
    anchors = anchor_points(graph, fidelity)
    points = climb(
        Graph(
            start=anchors,
            edges=graph.segments,
            wanted=graph.segment_shares,
            passes=np.array(passes, dtype=np.int64).reshape(-1, 4),
        ),
        how,
    )
    start, end = (
        _drawing(
            network,
            {
                link.id: [(float(at[i, 0]), float(at[i, 1])) for i in chains[link.id]]
                for link in network.links
            },
        )
        for at in (anchors, points)
    )
    return start, end


def _drawing(network: Network, paths: dict[str, list[tuple[float, float]]]) -> Drawing:
    seen = set()
    for line in network.lines:
        for course in line.courses:
            for a, b, c in zip(course, course[1:], course[2:], strict=False):
                pair = [network.link_between[frozenset(x)].id for x in ((a, b), (b, c))]
                if pair[0] != pair[1]:
                    seen.add((line.id, b, *sorted(pair)))
    ends = {link.id: (link.start, link.end) for link in network.links}
    return Drawing(ends, paths, [(b, first, second) for _, b, first, second in sorted(seen)])


def _chains(graph: PlaneGraph) -> dict[str, list[int]]:
    """Give per link (and walk) the points of the plane graph from its start to its end."""
    after: dict[str, dict[int, int]] = defaultdict(dict)
    for piece in graph.pieces:
        for part, (a, b) in zip(piece.parts, itertools.pairwise(piece.nodes), strict=True):
            here, there = (a, b) if part.forward else (b, a)
            after[part.owner][here] = there
    chains = {}
    for owner, steps in after.items():
        chain = sorted(set(steps) - set(steps.values()))
        while chain[-1] in steps:
            chain.append(steps[chain[-1]])
        chains[owner] = chain
    return chains


def _passes(network: Network, chains: dict[str, list[int]]) -> Iterator[tuple[int, int, int]]:
    """Per line every (vertex, neighbor, neighbor) that it runs through, crossings included."""
    for line in network.lines:
        seen = set()
        for course in line.courses:
            run: list[int] = []
            for a, b in itertools.pairwise(course):
                link = network.link_between[frozenset((a, b))]
                chain = chains[link.id] if link.start == a else chains[link.id][::-1]
                run += chain[1:] if run else chain
            for a, b, c in zip(run, run[1:], run[2:], strict=False):
                if a != c:
                    seen.add((b, min(a, c), max(a, c)))
        yield from sorted(seen)


def compare(name: str, network: Network, settings: LayoutSettings, how: Climb) -> dict[str, object]:
    """Draw a network both ways; give the row of the table."""
    start = time.process_time()
    ours = by_engine(network, settings)
    middle = time.process_time()
    begun, theirs = by_climb(network, settings.fidelity, how)
    end = time.process_time()
    row: dict[str, object] = {"network": name, "stations": len(network.stations)}
    row |= {"engine s": round(middle - start, 2), "climb s": round(end - middle, 2)}
    for who, drawing in (("start", begun), ("climb", theirs), ("engine", ours)):
        row |= {f"{criterion}, {who}": v for criterion, v in scores(drawing, network).items()}
    return row


def main() -> None:
    """Compare on all networks asked for; print and write the table and a summary."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("feeds", type=Path, nargs="*", default=[Path("data/before.zip")])
    parser.add_argument("--out", type=Path, required=True, help="folder for the table")
    parser.add_argument("--sizes", type=int, nargs="*", default=[50, 100, 250, 500])
    parser.add_argument("--kinds", nargs="+", choices=sorted(KINDS))
    parser.add_argument("--seeds", type=int, default=2)
    parser.add_argument("--sweeps", type=int, default=60, help="of the hill climb")
    parser.add_argument(
        "--weights", type=float, nargs=5, default=[1.0] * 5,
        help="of the hill climb: angles, length, balance, straightness, octilinearity",
    )  # fmt: skip
    parser.add_argument("--fidelity", type=float, default=0.0)
    parser.add_argument("--effort", default="standard", choices=("quick", "standard", "thorough"))
    asked = parser.parse_args()
    asked.out.mkdir(parents=True, exist_ok=True)
    settings = LayoutSettings.model_validate({"effort": asked.effort, "fidelity": asked.fidelity})
    compare("", KINDS["grid"](30, 0), settings, Climb(sweeps=2))
    how = Climb(sweeps=asked.sweeps, weights=tuple(asked.weights))
    rows: list[dict[str, object]] = []
    kinds = asked.kinds or ["radial", "ring-radial", "grid", "tree"]
    for name, network in _networks(asked.feeds, asked.sizes, kinds, asked.seeds):
        try:
            rows.append(compare(name, network, settings, how))
        except SchematicError as error:
            print(f"{name}: {error}", flush=True)
            continue
        _print_row(rows[-1])
        with (asked.out / "quality.csv").open("w", newline="", encoding="utf-8") as file:
            table = csv.DictWriter(file, list(rows[0]))
            table.writeheader()
            table.writerows(rows)
    _summary(rows)


def _networks(
    feeds: list[Path], sizes: list[int], kinds: list[str], seeds: int
) -> Iterator[tuple[str, Network]]:
    for feed in feeds:
        yield feed.stem, build_network(read_feed([feed], FeedSettings()), NetworkSettings())
    for size, kind, seed in itertools.product(sizes, kinds, range(seeds)):
        yield f"{kind} {size} seed {seed}", KINDS[kind](size, seed)


def _number(row: dict[str, object], key: str) -> float:
    return float(str(row[key]))


def _print_row(row: dict[str, object]) -> None:
    seconds = f"{row['engine s']} s against {row['climb s']} s"
    print(
        f"{row['network']}: {row['stations']} stations, {seconds}; start, climb, engine:",
        flush=True,
    )
    for criterion in CRITERIA:
        start, theirs, ours = (
            _number(row, f"{criterion}, {who}") for who in ("start", "climb", "engine")
        )
        mark = "" if ours <= theirs + _EQUAL else "   worse"
        print(f"  {criterion:22}{start:10.2f}{theirs:10.2f}{ours:10.2f}{mark}", flush=True)


def _summary(rows: list[dict[str, object]]) -> None:
    if not rows:
        return
    print(f"of {len(rows)} networks the engine is better or equal on")
    for criterion in CRITERIA:
        pairs = [[_number(r, f"{criterion}, {who}") for who in ("engine", "climb")] for r in rows]
        held = sum(ours <= theirs + _EQUAL for ours, theirs in pairs)
        sums = [sum(column) for column in zip(*pairs, strict=True)]
        print(f"  {criterion:22}{held:4}   sums {sums[0]:.1f} against {sums[1]:.1f}")
    ratios = [
        _number(r, "climb s") / max(_number(r, "engine s"), 0.01)
        for r in rows
        if _number(r, "stations") >= 100
    ]
    if ratios:
        mean = math.exp(statistics.fmean(map(math.log, ratios)))
        print(f"climb / engine, 100 stations and more: {min(ratios):.2f} at least, mean {mean:.2f}")


if __name__ == "__main__":
    main()
