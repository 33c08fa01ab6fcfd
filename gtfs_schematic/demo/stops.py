"""From places to the rows of stops.txt and the stop ids that trips call at."""

from __future__ import annotations

from gtfs_schematic.demo.ground import lon_lat
from gtfs_schematic.demo.lines import Line
from gtfs_schematic.demo.places import Place
from gtfs_schematic.demo.region import Region

Row = tuple[str, ...]

HEADER: Row = (
    "stop_id",
    "stop_code",
    "stop_name",
    "stop_lat",
    "stop_lon",
    "location_type",
    "parent_station",
    "wheelchair_boarding",
    "platform_code",
)
_TRACK_OFFSET = {
    "M": (0, 20),
    "U": (25, 0),
    "O": (-25, -10),
    "T": (10, -40),
    "R": (-15, 45),
    "B": (40, 25),
}
"""Metres from a station's middle to its platforms, by the letter of the lines' tracks."""
_SIDE = 12
"""Metres east and south from the stop of one direction to that of the other, halved."""
_STEPS_TO = {"122-T1", "122-T2"}
"""Platforms with steps in a step-free station."""
_ENTRANCES = {"hub": ((-45, -60), (70, 10))}


def stop_id(place: Place, line: Line, direction: int) -> str:
    """Give the stop where trips of a line in one direction call at a place."""
    if place.kind == "station":
        return f"{place.number}-{line.track}{direction + 1}"
    if place.kind == "pair":
        return f"{place.number}-{direction + 1}"
    return str(place.number)


def top_ids(place: Place) -> tuple[str, ...]:
    """Give the ids of a place's rows that have no parent."""
    if place.kind == "pair":
        return (f"{place.number}-1", f"{place.number}-2")
    return (str(place.number),)


def platform_ids(region: Region) -> dict[str, tuple[str, ...]]:
    """Give the ids of the platforms in use, sorted, by the key of their station."""
    places = region.place()
    used: dict[str, set[str]] = {}
    for line in region.lines:
        for run in line.runs:
            for key in run.calls:
                if places[key].kind == "station":
                    ids = used.setdefault(key, set())
                    ids.add(stop_id(places[key], line, run.direction))
    return {key: tuple(sorted(ids)) for key, ids in sorted(used.items())}


def _row(place: Place, row_id: str, offset: tuple[int, int], **fields: str) -> Row:
    lon, lat = lon_lat(place.east + offset[0], place.north + offset[1])
    return (
        row_id,
        fields.get("code", ""),
        place.name,
        f"{lat:.6f}",
        f"{lon:.6f}",
        fields.get("location_type", "0"),
        fields.get("parent", ""),
        fields.get("access", ""),
        fields.get("platform", ""),
    )


def _station_rows(place: Place, platforms: tuple[str, ...]) -> list[Row]:
    parent = str(place.number)
    rows = [
        _row(place, parent, (0, 0), code=parent, location_type="1", access=str(place.access)),
    ]
    for platform in platforms:
        label = platform.split("-")[1]
        east, north = _TRACK_OFFSET[label[0]]
        side = _SIDE if label[1] == "1" else -_SIDE
        # An empty cell takes the station's own flag; only exceptions are written.
        access = "2" if platform in _STEPS_TO else ""
        offset = (east + side, north - side)
        fields = {"parent": parent, "access": access, "platform": label}
        rows.append(_row(place, platform, offset, **fields))
    for count, offset in enumerate(_ENTRANCES.get(place.key, ()), start=1):
        rows.append(
            _row(place, f"{parent}-E{count}", offset, location_type="2", parent=parent),
        )
    return rows


def _street_rows(place: Place) -> list[Row]:
    access = str(place.access)
    if place.kind == "single":
        return [_row(place, str(place.number), (0, 0), access=access)]
    return [
        _row(place, row_id, (side, -side), code=str(place.number), access=access)
        for row_id, side in zip(top_ids(place), (_SIDE, -_SIDE), strict=True)
    ]


def stop_rows(region: Region) -> list[Row]:
    """Give stops.txt without its header, in the order of the places."""
    platforms = platform_ids(region)
    rows: list[Row] = []
    for place in region.served():
        if place.kind == "station":
            rows += _station_rows(place, platforms[place.key])
        else:
            rows += _street_rows(place)
    return rows
