"""Reading stops.txt: where stops lie, which station they belong to, who can board."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace
from functools import partial

from gtfs_schematic.feed.cells import Cell, is_usable_id, name_of, whole_of
from gtfs_schematic.feed.findings import Notebook
from gtfs_schematic.feed.model import Boarding, Stop
from gtfs_schematic.feed.tables import Tables
from gtfs_schematic.feed.values import clean_name, is_clean, is_nowhere, parse_degrees

_FILE = "stops.txt"
_COLUMNS = (
    "stop_id",
    "stop_name",
    "stop_code",
    "stop_lat",
    "stop_lon",
    "location_type",
    "parent_station",
    "wheelchair_boarding",
    "platform_code",
)
_KINDS = {"": 0, **{str(n): n for n in range(5)}}
_MOST_ABOVE = 5
"""More stations above one another than any feed needs: a boarding area has two."""
_ODD_PLACES = {1: "a station", 2: "an entrance", 3: "a generic node", 4: "a boarding area"}
_BOARDING: Mapping[str, Boarding] = {"": "unknown", "0": "unknown", "1": "yes", "2": "no"}


@dataclass(frozen=True)
class StopTable:
    """All rows of stops.txt, with their own values and with those they inherit."""

    own: Mapping[str, Stop]
    """As the feed has them: parent as written, coordinates None where there are none."""
    rows: Mapping[str, int]
    chain: Mapping[str, tuple[str, ...]]
    """Per stop the ids above it, nearest first, the top station last."""
    placed: Mapping[str, tuple[float, float]] = field(default_factory=dict)
    """Lon and lat in degrees of every stop that can be placed; see `read_stops`."""


def read_stops(tables: Tables) -> StopTable:
    """Read all stops and settle their parents and places.

    A stop's place is its own, else that of the nearest stop above it that has one, else (the
    whole family has none above) the mean of those below its top station.
    """
    own: dict[str, Stop] = {}
    rows: dict[str, int] = {}
    blank: set[str] = set()
    notes = tables.notebook
    for row, texts in tables.rows(_FILE, _COLUMNS):
        ident, name, code, lat, lon, type_, parent, boarding, platform = texts
        at = partial(Cell, _FILE, row)
        plain = ident and ident not in rows and ident.isprintable()
        if not plain and not is_usable_id(notes, at("stop_id", ident), rows):
            continue
        rows[ident] = row
        if not lon and not lat:
            blank.add(ident)
        place = _place(notes, row, lon, lat)
        own[ident] = Stop(
            ident,
            name if is_clean(name) else name_of(notes, at("stop_name", name)),
            clean_name(code) if code else "",
            place[0] if place else None,
            place[1] if place else None,
            _KINDS[type_] if type_ in _KINDS else _kind(notes, at("location_type", type_)),
            parent or None,
            _BOARDING[boarding]
            if boarding in _BOARDING
            else _boarding(notes, at("wheelchair_boarding", boarding)),
            platform_code=clean_name(platform) if platform else "",
        )
    chain = {
        ident: _chain(tables, own, rows, ident) if stop.parent_id else ()
        for ident, stop in own.items()
    }
    placed = _placed(own, chain)
    for ident in sorted(blank - placed.keys(), key=rows.__getitem__):
        if own[ident].location_type == 0:
            fault = "stop has no coordinates, nor has its station; it is left out"
            notes.find("error", _FILE, fault, row=rows[ident], value=ident)
    return StopTable(own, rows, chain, placed)


def stops_of_timetable(tables: Tables, table: StopTable, called: Iterable[str]) -> tuple[Stop, ...]:
    """Give the stops called at and the stations above them, ready for the timetable.

    `parent_id` is the top station; boarding that a stop does not tell is that of the stop above
    (GTFS Schedule reference, stops.txt, wheelchair_boarding); every stop has coordinates.
    """
    wanted = set()
    for ident in sorted(called):
        wanted.add(ident)
        wanted.update(table.chain[ident][-1:])
        if (kind := _ODD_PLACES.get(table.own[ident].location_type)) is not None:
            fault = f"trips call at {kind}, which is no stop; it is taken for one"
            tables.notebook.find("warning", _FILE, fault, row=table.rows[ident], value=ident)
    return tuple(_settled(tables, table, ident) for ident in sorted(wanted))


def leave_out_unserved(tables: Tables, table: StopTable, stops: Iterable[Stop], when: str) -> None:
    """Note the stops and stations of the feed that no trip in the timetable calls at."""
    served = {stop.id for stop in stops}
    kinds = {0: "stop", 1: "station"}
    for ident, stop in table.own.items():
        if ident not in served and stop.location_type in kinds:
            reason = f"no trip that is drawn calls at it {when}"
            tables.notebook.leave_out(kinds[stop.location_type], ident, reason)


def _settled(tables: Tables, table: StopTable, ident: str) -> Stop:
    stop, above, row = table.own[ident], table.chain[ident], table.rows[ident]
    if stop.name and stop.lon is not None and not above:
        return replace(stop, parent_id=None) if stop.parent_id else stop
    lon, lat = table.placed[ident]
    if stop.lon is None:
        message = "stop has no coordinates of its own and is put where its station or platforms lie"
        tables.notebook.find("warning", _FILE, message, row=row, value=ident)
    family = [stop, *(table.own[parent] for parent in above)]
    name = next((member.name for member in family if member.name), "")
    if not stop.name:
        message = "stop has no name; its station's name, its code or its id stands for it"
        tables.notebook.find("warning", _FILE, message, row=row, field="stop_name", value=ident)
    told: list[Boarding] = [m.boarding for m in family if m.boarding != "unknown"]
    return replace(
        stop,
        name=name or stop.code or ident,
        lon=lon,
        lat=lat,
        parent_id=above[-1] if above else None,
        boarding=told[0] if told else "unknown",
    )


def _kind(notebook: Notebook, cell: Cell) -> int:
    """Give a location type that is not written plainly."""
    kind = whole_of(notebook, cell) or 0
    if kind in range(5):
        return kind
    cell.found(notebook, "warning", "location type is not one of 0 to 4; taken as 0")
    return 0


def _boarding(notebook: Notebook, cell: Cell) -> Boarding:
    """Give a flag of boarding that is not written plainly."""
    return _BOARDING.get(str(whole_of(notebook, cell)), "unknown")


def _place(notebook: Notebook, row: int, lon: str, lat: str) -> tuple[float, float] | None:
    if not lon and not lat:
        return None
    try:
        place = parse_degrees(lon, 180.0), parse_degrees(lat, 90.0)
    except ValueError:
        for name, text, limit in (("stop_lon", lon, 180.0), ("stop_lat", lat, 90.0)):
            try:
                parse_degrees(text, limit)
            except ValueError:
                fault = "coordinate is not a number of degrees within its range; it does not count"
                Cell(_FILE, row, name, text).found(notebook, "error", fault)
                break
        return None
    if is_nowhere(*place):
        fault = "coordinates near 0, 0 or at a pole stand for none; they do not count"
        Cell(_FILE, row, "stop_lat", lat).found(notebook, "error", fault)
        return None
    return place


def _chain(
    tables: Tables, own: Mapping[str, Stop], rows: Mapping[str, int], ident: str
) -> tuple[str, ...]:
    """Follow parents up to the top; broken references end the chain and are found."""
    chain: list[str] = []
    here = own[ident]
    while here.parent_id is not None:
        fault = ""
        if here.location_type == 1:
            fault = "a station may have no station above it; it does not count"
        elif here.parent_id not in own:
            fault = "parent station is not in stops.txt; it does not count"
        elif here.parent_id == ident or here.parent_id in chain:
            fault = "parent stations go round in a circle; it does not count"
        elif len(chain) == _MOST_ABOVE:
            fault = "parent stations go up without end, as in a circle; it does not count"
        if fault:
            if here.id == ident or "circle" in fault:  # else found at the row at fault
                tables.notebook.find(
                    "error",
                    _FILE,
                    fault,
                    row=rows[ident],
                    field="parent_station",
                    value=here.parent_id,
                )
            # In a circle nobody is on top: all its stops stand alone.
            return () if "circle" in fault else tuple(chain)
        chain.append(here.parent_id)
        here = own[here.parent_id]
    if len(chain) == 1 and here.location_type != 1 and own[ident].location_type != 4:
        tables.notebook.find(
            "warning",
            _FILE,
            "stop above is not marked as a station (location type 1); it is taken as one",
            row=rows[ident],
            field="parent_station",
            value=chain[-1],
        )
    return tuple(chain)


def _placed(
    own: Mapping[str, Stop], chain: Mapping[str, tuple[str, ...]]
) -> dict[str, tuple[float, float]]:
    below: defaultdict[str, list[tuple[float, float]]] = defaultdict(list)
    for ident in sorted(own):  # sorted: a mean of floats hangs on their order
        stop = own[ident]
        if chain[ident] and stop.location_type == 0 and stop.lon is not None:
            below[chain[ident][-1]].append((stop.lon, stop.lat or 0.0))
    placed = {}
    for ident, stop in own.items():
        if stop.lon is not None and stop.lat is not None:
            placed[ident] = (stop.lon, stop.lat)
            continue
        for member in (own[i] for i in (ident, *chain[ident])):
            if member.lon is not None and member.lat is not None:
                placed[ident] = (member.lon, member.lat)
                break
        else:
            points = below[(ident, *chain[ident])[-1]]
            if points:
                lons, lats = zip(*points, strict=True)
                placed[ident] = (sum(lons) / len(lons), sum(lats) / len(lats))
    return placed
