"""Whatever is damaged in a feed: a sound timetable comes out, or an error made for a person."""

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
}
JUNK = st.sampled_from(
    [
        *("", " ", "0", "1", "2", "-1", "99999999999999999999", "nan", "NA"),
        *("gate", "tams", "t1", "wk", "t1a"),
        *("25:61:00", "999:00:00", "00000000", "20260231", "99991231"),
        *("#", '"', "\n", "\x00", "é,"),
    ]
) | st.text(max_size=4)


@given(st.data())
@settings(max_examples=100)
def test_damaged_cells_never_break_the_reading(town_files, data):
    files = {**town_files, **EXTRA}
    for _ in range(data.draw(st.integers(1, 4))):
        name = data.draw(st.sampled_from(sorted(files)))
        rows = list(csv.reader(io.StringIO(files[name])))
        if not rows:
            continue
        row = data.draw(st.integers(0, len(rows) - 1))
        if not rows[row]:
            continue
        kind = data.draw(st.sampled_from(["cell", "cell", "cell", "lose", "double", "short"]))
        if kind == "cell":
            rows[row][data.draw(st.integers(0, len(rows[row]) - 1))] = data.draw(JUNK)
        elif kind == "lose":
            del rows[row]
        elif kind == "double":
            rows.append(list(rows[row]))
        else:
            rows[row].pop()
        text = io.StringIO()
        csv.writer(text).writerows(rows)
        files[name] = text.getvalue()
    with tempfile.TemporaryDirectory() as folder:
        for name, text in files.items():
            Path(folder, name).write_bytes(text.encode("utf-8", "surrogatepass"))
        try:
            timetable = read_feed([Path(folder)], FeedSettings(language="fr"))
        except SchematicError as error:
            assert len(str(error)) > 20  # noqa: PT017 - either outcome is right
        else:
            assert faults(timetable) == ()
