"""Whatever is damaged in a feed: a sound timetable comes out, or an error made for a person.

Nothing is lost in silence: routes and stops are drawn or listed as left out.
"""

from __future__ import annotations

import csv
import io
import tempfile
from pathlib import Path

from hypothesis import given, settings
from hypothesis import strategies as st

from gtfs_schematic.errors import SchematicError
from gtfs_schematic.feed.check import faults
from gtfs_schematic.feed.model import FeedSettings
from gtfs_schematic.feed.read import read_feed

EXTRA = {
    "transfers.txt": (
        "from_stop_id,to_stop_id,transfer_type,min_transfer_time\ngate,tams,2,60\nvend,parv,0,\n"
    ),
    "frequencies.txt": "trip_id,start_time,end_time,headway_secs\nb7a,06:00:00,07:00:00,600\n",
    "calendar_dates.txt": "service_id,date,exception_type\nwk,20260302,2\nsa,20260303,1\n",
    "feed_info.txt": (
        "feed_publisher_name,feed_lang,feed_start_date,feed_end_date\nOulm,en,20260301,20260331\n"
    ),
    "translations.txt": "trans_id,lang,translation\nTamselby,fr,Tamselle\n",
    "attributions.txt": "organization_name,route_id\nOulm,t1\n",
    "networks.txt": "network_id,network_name\nland,On land\n",
    "route_networks.txt": "network_id,route_id\nland,t1\n",
}
JUNK = st.sampled_from(
    [
        *("", " ", "0", "1", "2", "-1", "99999999999999999999", "nan", "NA"),
        *("gate", "tams", "t1", "wk", "t1a"),
        *("25:61:00", "999:00:00", "00000000", "20260231", "99991231"),
        *("#", '"', "\n", "\x00", "é,"),
    ]
) | st.text(max_size=4)


def ids_in(text, name, other=None):
    """Give the plain ids of a table, with the first value that each has in another column."""
    head, *rows = csv.reader(io.StringIO(text, newline=""))
    names = [column.strip() for column in head]
    at, beside = names.index(name), names.index(other) if other in names else None
    found = {}
    for row in rows:
        if len(row) == len(names) and row != head:
            ident = row[at].strip()
            if ident and ident.isprintable():
                found.setdefault(ident, "" if beside is None else row[beside].strip())
    return found


def lost(timetable, files):
    """Give the routes and stops that are neither drawn nor listed, or both."""
    listed = {(item.kind, item.id) for item in timetable.left_out}
    routes = {route.id for route in timetable.routes}
    stops = {stop.id for stop in timetable.stops}
    return [
        *(
            ident
            for ident in ids_in(files["routes.txt"], "route_id")
            if (ident in routes) == (("route", ident) in listed)
        ),
        *(
            ident
            for ident, kind in ids_in(files["stops.txt"], "stop_id", "location_type").items()
            if kind in {"", "0", "1"}
            and (ident in stops) == bool({("stop", ident), ("station", ident)} & listed)
        ),
    ]


def damaged(data, text):
    """Change, lose, double or shorten a row of a table."""
    rows = list(csv.reader(io.StringIO(text, newline="")))
    row = data.draw(st.integers(0, len(rows) - 1)) if rows else 0
    if not rows or not rows[row]:
        return text
    kind = data.draw(st.sampled_from(["cell", "cell", "cell", "lose", "double", "short"]))
    if kind == "cell":
        rows[row][data.draw(st.integers(0, len(rows[row]) - 1))] = data.draw(JUNK)
    elif kind == "lose":
        del rows[row]
    elif kind == "double":
        rows.append(list(rows[row]))
    else:
        rows[row].pop()
    written = io.StringIO(newline="")
    csv.writer(written).writerows(rows)
    return written.getvalue()


@given(st.data())
@settings(max_examples=100)
def test_damaged_cells_never_break_the_reading(town_files, data):
    files = {**town_files, **EXTRA}
    for _ in range(data.draw(st.integers(1, 4))):
        name = data.draw(st.sampled_from(sorted(files)))
        files[name] = damaged(data, files[name])
    with tempfile.TemporaryDirectory() as folder:
        for name, text in files.items():
            Path(folder, name).write_bytes(text.encode("utf-8", "surrogatepass"))
        try:
            timetable = read_feed([Path(folder)], FeedSettings(language="fr"))
        except SchematicError as error:
            assert len(str(error)) > 20  # noqa: PT017 - either outcome is right
        else:
            assert faults(timetable) == ()
            assert lost(timetable, files) == []
