"""A small feed of an invented town, and a way to change one table of it at a time."""

from __future__ import annotations

import zipfile
from collections.abc import Callable, Mapping
from pathlib import Path

import pytest

from gtfs_schematic.feed.model import FeedSettings, Timetable
from gtfs_schematic.feed.read import read_feed

Changes = Mapping[str, str | bytes | None]

TOWN: dict[str, str] = {
    "agency.txt": """\
agency_id,agency_name,agency_url,agency_timezone,agency_lang
oulm,Oulm Tramways,https://oulm.example,Europe/Zurich,en
""",
    "stops.txt": """\
stop_id,stop_name,stop_code,stop_lat,stop_lon,location_type,parent_station,wheelchair_boarding
gate,Oulmgate,,47.000,8.000,1,,1
gate1,Oulmgate,101,47.0001,8.0001,0,gate,
gate2,Oulmgate,102,47.0002,8.0002,,gate,2
tams,Tamselby,2,47.010,8.000,0,,
vend,Vendrick Locks,3,47.020,8.010,0,,1
parv,Parvinholm,4,47.030,8.020,0,,2
""",
    "routes.txt": """\
route_id,agency_id,route_short_name,route_long_name,route_type,route_color,route_text_color
t1,oulm,1,Oulmgate to Parvinholm,0,1a2B3c,FFFFFF
b7,oulm,7,Locks bus,3,,
""",
    "trips.txt": """\
route_id,service_id,trip_id,trip_headsign,direction_id,shape_id
t1,wk,t1a,Parvinholm,0,up
t1,wk,t1b,Parvinholm,0,up
t1,wk,t1c,Oulmgate,1,
t1,sa,t1s,Parvinholm,0,up
b7,wk,b7a,Tamselby,,
""",
    "stop_times.txt": """\
trip_id,arrival_time,departure_time,stop_id,stop_sequence
t1a,8:00:00,08:00:30,gate1,1
t1a,08:04:00,08:04:00,tams,2
t1a,08:09:00,08:09:30,vend,5
t1a,08:15:00,08:15:00,parv,6
t1b,25:00:00,25:00:30,gate1,1
t1b,25:06:00,25:06:00,tams,2
t1b,25:11:00,25:11:30,vend,3
t1b,25:17:00,25:17:00,parv,4
t1c,09:00:00,09:00:00,parv,1
t1c,09:06:00,09:06:00,vend,2
t1c,09:11:00,09:11:00,tams,3
t1c,09:15:00,09:15:00,gate2,4
t1s,10:00:00,10:00:00,gate1,1
t1s,10:04:00,10:04:00,tams,2
b7a,07:00:00,07:00:00,vend,1
b7a,07:08:00,07:08:00,tams,2
""",
    "calendar.txt": """\
service_id,monday,tuesday,wednesday,thursday,friday,saturday,sunday,start_date,end_date
wk,1,1,1,1,1,0,0,20260302,20260329
sa,0,0,0,0,0,1,0,20260302,20260329
""",
    "shapes.txt": """\
shape_id,shape_pt_lat,shape_pt_lon,shape_pt_sequence
up,47.030,8.020,30
up,47.000,8.000,4
up,47.010,8.000,10
""",
}
"""Four weeks from Monday 2 March 2026: a tram on weekdays and Saturdays, a bus on weekdays."""


@pytest.fixture
def town(tmp_path: Path) -> Callable[..., Path]:
    """Give a function that writes the town's feed with changes; see `write_zip`."""

    def write(changes: Changes | None = None, name: str = "town.zip") -> Path:
        return write_zip(tmp_path / name, {**TOWN, **(changes or {})})

    return write


@pytest.fixture
def read_town(town: Callable[..., Path]) -> Callable[..., Timetable]:
    """Give a function that reads the town's feed with changes; keywords are settings."""

    def read(changes: Changes | None = None, **settings: object) -> Timetable:
        return read_feed([town(changes)], FeedSettings.model_validate(settings))

    return read


@pytest.fixture
def table() -> Callable[[str], str]:
    """Give a function that gives a table of the town's feed as it is."""
    return TOWN.__getitem__


def write_zip(path: Path, files: Changes) -> Path:
    """Write a zip; a file whose content is None is left out."""
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in files.items():
            if content is not None:
                archive.writestr(name, content)
    return path


@pytest.fixture(scope="session")
def town_files() -> dict[str, str]:
    """Give the tables of the town's feed by file name."""
    return dict(TOWN)
