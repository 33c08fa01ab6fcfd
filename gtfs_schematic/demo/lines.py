"""The lines of the invented region before the service change: where they call, and when."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from gtfs_schematic.demo.plans import (
    BUS,
    BUS_WEEKDAY_ONLY,
    EXPRESS,
    FERRY,
    METRO,
    NIGHT,
    OFF_PEAK,
    PEAK,
    RAIL,
    RING,
    TRAM,
    TWO_BRANCHES,
    Plan,
    later,
)

Mode = Literal["tram", "metro", "rail", "bus", "ferry"]


@dataclass(frozen=True, slots=True)
class Run:
    """Trips of one line in one direction that all call at the same places."""

    calls: tuple[str, ...]
    """Place keys in order."""
    direction: int
    plan: Plan
    path: tuple[str, ...]
    """Place keys passed on the way, calls included: what a shape is drawn through."""
    headsign: str = ""
    """Empty: the name of the last place."""


@dataclass(frozen=True, slots=True)
class Line:
    """One route of the feed; `color` is RRGGBB, empty where the feed leaves it out."""

    key: str
    name: str
    long_name: str
    mode: Mode
    color: str
    track: str
    """Letter of the platforms that it uses in a station."""
    order: int
    runs: tuple[Run, ...]
    shaped: bool = False
    """Whether shapes.txt has its course."""
    by_headway: bool = False
    """Whether frequencies.txt counts its trips."""


def _keys(text: str) -> tuple[str, ...]:
    return tuple(text.split())


def there_and_back(calls: str, plan: Plan, path: str = "", back_later: int = 0) -> tuple[Run, Run]:
    """Give a run and its mirror, which leaves `back_later` minutes later."""
    out, course = _keys(calls), _keys(path or calls)
    return (
        Run(out, 0, plan, course),
        Run(out[::-1], 1, later(plan, back_later), course[::-1]),
    )


_RING = "r01 r02 r03 r04 r05 r06 r07 r08 r09 r10 r11 r12 r13 r14 r15 r16 r01"
_TRUNK = "j1 r01 hub mid mill r09 j2"
_WEST = "w6 w5 w4 w3 r13 w2 w1 mid e1 e2 r05 e3 e4"
_NORTH_EAST = f"a4 a3 a2 a1 {_TRUNK} b1 b2 b3 b4"
_RAIL = "x1 x2 x3 x4 r15 hub x5 x6 x7 x8"
_AVENUE = "p1 p2 p3 p4"
_LAKE_LOOP_OUT = "l1 l2 l3 r06 e1 mid l4 r14 l5 l6 l7 l8 l9"
_LAKE_LOOP_BACK = "l9 l10 l7 l6 l5 r14 l4 mid e1 r06 l3 l2 l1"

RING_RUNS = (
    Run(_keys(_RING), 0, RING, _keys(_RING), "Årvesk"),
    Run(_keys(_RING)[::-1], 1, later(RING, 3), _keys(_RING)[::-1], "Néřvesk"),
)

LINES: tuple[Line, ...] = (
    Line("m1", "1", "Årvesk Halveřen", "metro", "6B4596", "O", 10, RING_RUNS, shaped=True),
    Line(
        "m2",
        "2",
        "Lethrovald – Brankelvéd / Ovředahém",
        "metro",
        "C23A3A",
        "M",
        20,
        (
            *there_and_back(f"{_WEST} e5 e6 e7", TWO_BRANCHES, back_later=2),
            *there_and_back(f"{_WEST} f1 f2 f3 f4", later(TWO_BRANCHES, 5), back_later=2),
        ),
        shaped=True,
        by_headway=True,
    ),
    Line(
        "m3",
        "3",
        "Åldremeső – Pradvelő-ur-Sulmé",
        "metro",
        "1C6E9E",
        "U",
        30,
        there_and_back(f"n3 n2 n1 {_TRUNK} s1 s2 s3 s4", METRO, back_later=4),
    ),
    Line(
        "m4",
        "4",
        "Felugresk – Zanvůrek",
        "metro",
        "2F8A4A",
        "U",
        40,
        (
            *there_and_back(_NORTH_EAST, later(OFF_PEAK, 4), back_later=2),
            *there_and_back(f"{_NORTH_EAST} b5 b6", later(PEAK, 4), back_later=2),
        ),
    ),
    Line(
        "t5",
        "5",
        "Gorvanåské – Sulåmeső",
        "tram",
        "D2621A",
        "T",
        50,
        there_and_back(
            "t1 t2 t3 r16 t4 hub t5 e1 t6 r07 p1 p3 p5 t7 t8",
            TRAM,
            f"t1 t2 t3 r16 t4 hub t5 e1 t6 r07 {_AVENUE} p5 t7 t8",
            back_later=5,
        ),
        shaped=True,
    ),
    Line(
        "t6",
        "6",
        "Mlåtuvé – Lómgresk",
        "tram",
        "1F73A6",
        "T",
        60,
        there_and_back(
            "u1 u2 u3 r11 u4 mill u5 r07 p2 p4 p5",
            later(TRAM, 6),
            f"u1 u2 u3 r11 u4 mill u5 r07 {_AVENUE} p5",
            back_later=3,
        ),
        shaped=True,
    ),
    Line(
        "t7",
        "7",
        "Lómvård Sål – Onimåst",
        "tram",
        "B8418C",
        "T",
        70,
        (
            Run(_keys(_LAKE_LOOP_OUT), 0, later(TRAM, 2), _keys(_LAKE_LOOP_OUT)),
            Run(_keys(_LAKE_LOOP_BACK), 1, later(TRAM, 9), _keys(_LAKE_LOOP_BACK)),
        ),
    ),
    Line(
        "b8",
        "8",
        "Jasmerőd – Perlåské",
        "bus",
        "",
        "B",
        80,
        there_and_back("l7 h1 t2 h2 n2 h3 a2 h4 h5 e6 h6 f3", BUS_WEEKDAY_ONLY, back_later=8),
    ),
    Line(
        "b9",
        "9",
        "Sorbelmeső – Lómgresk",
        "bus",
        "8C7A1E",
        "B",
        90,
        there_and_back("b3 k1 s2 k2 p5", BUS, back_later=10),
    ),
    Line(
        "r1",
        "R1",
        "Krastůmvéř-ur-Sethrå – Ånuvégrast",
        "rail",
        "4C5A66",
        "R",
        110,
        there_and_back(_RAIL, RAIL, back_later=10),
        shaped=True,
    ),
    Line(
        "rx",
        "RX",
        "Krastůmvéř-ur-Sethrå – Ånuvégrast, fésk",
        "rail",
        "8F5236",
        "R",
        120,
        there_and_back("x1 x3 hub x6 x8", EXPRESS, _RAIL, back_later=20),
        shaped=True,
    ),
    Line(
        "f1",
        "F1",
        "Pirő Lómvård – Sulåmeső – Murovilé",
        "ferry",
        "0E9494",
        "F",
        130,
        there_and_back("y1 y2 y3", FERRY, back_later=50),
    ),
    Line(
        "n1",
        "N1",
        "Lethrovald – Felugresk, nukt",
        "bus",
        "23275F",
        "B",
        140,
        there_and_back("w6 w5 w4 w3 r13 w2 w1 mid hub r01 j1 a1 a2 a3 a4", NIGHT, back_later=15),
    ),
)
