"""The places of the invented region before the service change, in metres from its centre."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

PlaceKind = Literal["station", "pair", "single"]


@dataclass(frozen=True, slots=True)
class Place:
    """A place where lines call; `east` and `north` are metres from the region's centre."""

    key: str
    number: int
    """What the stop ids are made from; never used for another place."""
    kind: PlaceKind
    """"station": a parent with platforms; "pair": one stop for each direction, without a
    parent; "single": one stop for both directions."""
    access: int
    """Step-free access as in stops.txt: 0 unknown, 1 yes, 2 no."""
    east: int
    north: int
    name: str


PLACES: tuple[Place, ...] = (
    # The ring, clockwise from the north.
    Place("r01", 101, "station", 1, 110, 1780, "Thanvård"),
    Place("r02", 102, "station", 2, 860, 1660, "Zelmozaré"),
    Place("r03", 103, "station", 1, 1690, 1170, "Iskefåt"),
    Place("r04", 104, "station", 0, 2060, 680, "Pluvenő"),
    Place("r05", 105, "station", 1, 2250, 110, "Kesmiřa"),
    Place("r06", 106, "station", 1, 2180, -500, "Kélorin"),
    Place("r07", 107, "station", 1, 1660, -1220, "Sethrakéth"),
    Place("r08", 108, "station", 2, 840, -1690, "Dúvamel"),
    Place("r09", 109, "station", 1, -110, -1800, "Hélvård"),
    Place("r10", 110, "station", 0, -940, -1580, "Bruskelő"),
    Place("r11", 111, "station", 1, -1760, -1080, "Jevadřé"),
    Place("r12", 112, "station", 2, -2200, -500, "Nokamír"),
    Place("r13", 113, "station", 1, -2300, 190, "Vrasthål"),
    Place("r14", 114, "station", 1, -2070, 840, "Quolmeřé"),
    Place("r15", 115, "station", 1, -1530, 1370, "Gluvenstå"),
    Place("r16", 116, "station", 2, -740, 1740, "Fennožé"),
    # The trunk of two metro lines, north to south.
    Place("j1", 121, "station", 1, 330, 2620, "Oskathån"),
    Place("hub", 122, "station", 1, 170, 920, "Halveřen Hemé"),
    Place("mid", 123, "station", 1, 0, 0, "Vardesål"),
    Place("mill", 124, "station", 1, -100, -900, "Sethramůl"),
    Place("j2", 125, "station", 2, -270, -2590, "Únderbrisk"),
    # Metro to the north, north-east, south and south-west.
    Place("n1", 131, "station", 1, 20, 3690, "Hořikéth"),
    Place("n2", 132, "station", 1, -880, 4850, "Hoskoreső"),
    Place("n3", 133, "station", 0, -700, 6200, "Åldremeső"),
    Place("a1", 141, "station", 2, 1020, 3460, "Wendřik"),
    Place("a2", 142, "station", 1, 1760, 4580, "Lůmkaveth"),
    Place("a3", 143, "station", 1, 2830, 5420, "Stovaré"),
    Place("a4", 144, "station", 1, 3270, 6850, "Felugresk"),
    Place("s1", 151, "station", 1, 200, -3530, "Cimbraté"),
    Place("s2", 152, "station", 2, 700, -4820, "Gelmůské"),
    Place("s3", 153, "station", 0, 380, -6050, "Thanomeső"),
    Place("s4", 154, "station", 1, 1420, -7500, "Pradvelő-ur-Sulmé"),
    Place("b1", 161, "station", 1, -1070, -3310, "Rumvanå"),
    Place("b2", 162, "station", 2, -1900, -4230, "Ekhovå"),
    Place("b3", 163, "station", 0, -2720, -5330, "Sorbelmeső"),
    Place("b4", 164, "station", 1, -4350, -5900, "Zanvůrek"),
    Place("b5", 165, "station", 0, -6000, -6600, "Kvořimesk"),
    Place("b6", 166, "station", 1, -7300, -8050, "Uvřathal-ur-Gresk"),
    # Metro to the west and to the east with its two branches.
    Place("w1", 171, "station", 2, -760, -50, "Plåzekreth"),
    Place("w2", 172, "station", 0, -1530, 50, "Tolmakéř"),
    Place("w3", 173, "station", 1, -3230, 60, "Beskulé"),
    Place("w4", 174, "station", 1, -4320, -470, "Horvemål"),
    Place("w5", 175, "station", 2, -5400, -640, "Žiravmé"),
    Place("w6", 176, "station", 1, -6700, -1500, "Lethrovald"),
    Place("e1", 181, "station", 1, 840, 50, "Kreskafél"),
    Place("e2", 182, "station", 2, 1530, 220, "Univaršét"),
    Place("e3", 183, "station", 1, 3200, 360, "Mulgavé"),
    Place("e4", 184, "station", 1, 4390, 720, "Thvorunå"),
    Place("e5", 185, "station", 1, 5460, 1320, "Ošpitål Gruvenő"),
    Place("e6", 186, "station", 0, 6650, 1640, "Šelvigé"),
    Place("e7", 187, "station", 2, 8350, 2420, "Brankelvéd"),
    Place("f1", 191, "station", 0, 5130, -330, "Alkimoré"),
    Place("f2", 192, "station", 1, 5750, -1560, "Lómvård"),
    Place("f3", 193, "station", 1, 7220, -1250, "Perlåské"),
    Place("f4", 194, "station", 2, 9000, -1620, "Ovředahém"),
    # The railway, west to east.
    Place("x1", 201, "station", 1, -14700, 780, "Krastůmvéř-ur-Sethrå"),
    Place("x2", 202, "station", 0, -10400, 1150, "Thursgrell"),
    Place("x3", 203, "station", 1, -6900, 2900, "Nevlathåř"),
    Place("x4", 204, "station", 2, -3950, 2480, "Ústrimé"),
    Place("x5", 205, "station", 1, 3510, 2310, "Kolmiská"),
    Place("x6", 206, "station", 1, 6700, 4350, "Vejamoře"),
    Place("x7", 207, "station", 0, 10900, 4750, "Thanomeső"),
    Place("x8", 208, "station", 1, 15000, 7100, "Ånuvégrast"),
    # The tram from the north-west across the centre to the lake.
    Place("t1", 301, "pair", 1, -4400, 5500, "Gorvanåské"),
    Place("t2", 302, "pair", 1, -3600, 3950, "Pětrumel"),
    Place("t3", 303, "pair", 0, -1870, 3040, "Zuverné"),
    Place("t4", 304, "pair", 2, -300, 1310, "Kanélik"),
    Place("t5", 305, "pair", 1, 540, 500, "Operåsål"),
    Place("t6", 306, "pair", 0, 1280, -580, "Riskamér"),
    Place("p1", 311, "pair", 1, 2060, -1790, "Avelé Jorun"),
    Place("p2", 312, "pair", 1, 2480, -2430, "Avelé Ondrin"),
    Place("p3", 313, "pair", 0, 2920, -3120, "Avelé Strathő"),
    Place("p4", 314, "pair", 1, 3250, -3750, "Avelé Kírvath"),
    Place("p5", 315, "pair", 1, 3500, -4400, "Lómgresk"),
    Place("t7", 321, "pair", 0, 4230, -5520, "Vůlnemé"),
    Place("t8", 322, "pair", 1, 5180, -6500, "Sulåmeső"),
    # The tram from the south-west.
    Place("u1", 331, "pair", 1, -4800, -3750, "Mlåtuvé"),
    Place("u2", 332, "pair", 0, -3700, -2720, "Okřenta"),
    Place("u3", 333, "pair", 1, -2610, -1830, "Hrůvenek"),
    Place("u4", 334, "pair", 2, -920, -1060, "Papříval"),
    Place("u5", 335, "pair", 0, 780, -1110, "Tesmůlen"),
    # The tram from the lake to the loop in the west.
    Place("l1", 341, "single", 1, 5590, -1690, "Lómvård Sål"),
    Place("l2", 342, "pair", 0, 4560, -1130, "Baltovér"),
    Place("l3", 343, "pair", 1, 3260, -620, "Sirenké"),
    Place("l4", 344, "pair", 1, -750, 500, "Librenård"),
    Place("l5", 345, "pair", 0, -3110, 1020, "Volmihé"),
    Place("l6", 346, "pair", 1, -4270, 870, "Krůvast"),
    Place("l7", 347, "pair", 1, -5200, 1000, "Jasmerőd"),
    Place("l8", 348, "single", 0, -5850, 1480, "Tvelgår"),
    Place("l9", 349, "single", 1, -6560, 1060, "Onimåst"),
    Place("l10", 350, "single", 0, -5950, 440, "Pavřelin"),
    # The ferry.
    Place("y1", 361, "single", 1, 5790, -1770, "Pirő Lómvård"),
    Place("y2", 362, "single", 1, 5250, -6420, "Sulåmeső"),
    Place("y3", 363, "single", 2, 11300, -7950, "Murovilé"),
    # Buses.
    Place("h1", 401, "single", 0, -5200, 3350, "Ziborék"),
    Place("h2", 402, "single", 1, -2050, 4620, "Polvenké"),
    Place("h3", 403, "single", 0, 520, 4930, "Stadřon"),
    Place("h4", 404, "single", 1, 3150, 4250, "Tekhnopål"),
    Place("h5", 405, "single", 0, 5300, 2760, "Granšúl"),
    Place("h6", 406, "single", 2, 7150, 300, "Hařibost"),
    Place("k1", 411, "single", 0, -1080, -5120, "Ilmavést"),
    Place("k2", 412, "single", 1, 2080, -4850, "Ribnelgresk"),
)
