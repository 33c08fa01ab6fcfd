"""The whole way: order of rows, packing, several feeds, progress."""

from __future__ import annotations

import dataclasses
import random
import tempfile
import zipfile
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from gtfs_schematic.errors import FeedError, UsageError
from gtfs_schematic.feed.check import faults
from gtfs_schematic.feed.model import FeedSettings
from gtfs_schematic.feed.read import read_feed
from gtfs_schematic.progress import Silent

RICH = {
    "transfers.txt": "from_stop_id,to_stop_id,transfer_type\ngate,tams,2\ntams,gate,0\nx,y,0\n",
    "frequencies.txt": (
        "trip_id,start_time,end_time,headway_secs\nb7a,06:00:00,07:00:00,600\n"
        "b7a,09:00:00,10:00:00,900\n"
    ),
    "calendar_dates.txt": "service_id,date,exception_type\nwk,20260302,2\nsa,20260303,1\n",
    "attributions.txt": "organization_name\nOulm Region\nAll Credits\n",
    "translations.txt": (
        "table_name,field_name,language,translation,record_id\n"
        "stops,stop_name,fr,Tamselle,tams\nstops,stop_name,fr,Porte,gate\n"
    ),
}


def same(one, other):
    """Tell whether two timetables are equal, shapes included."""
    plain = [dataclasses.replace(timetable, shapes={}) for timetable in (one, other)]
    return (
        plain[0] == plain[1]
        and one.shapes.keys() == other.shapes.keys()
        and all(np.array_equal(one.shapes[i], other.shapes[i]) for i in one.shapes)
    )


def shuffled(files, seed):
    generator = random.Random(seed)  # noqa: S311 - no secret
    names = list(files)
    generator.shuffle(names)
    result = {}
    for name in names:
        header, *rows = files[name].splitlines()
        generator.shuffle(rows)
        result[name] = "\n".join([header, *rows]) + "\n"
    return result


@given(st.integers(0, 2**32))
@settings(max_examples=40)
def test_order_of_rows_and_files_does_not_matter(town_files, seed):
    files = {**town_files, **RICH}
    # findings name rows, so the transfer of unknown stops stays out of this comparison
    files["transfers.txt"] = files["transfers.txt"].replace("x,y,0\n", "")
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        timetables = []
        for number, content in enumerate((files, shuffled(files, seed))):
            place = folder / str(number)
            place.mkdir()
            for file, text in content.items():
                (place / file).write_text(text, encoding="utf-8")
            timetables.append(read_feed([place], FeedSettings(language="fr")))
    assert same(*timetables)
    assert faults(timetables[0]) == ()


def test_the_fingerprint_is_of_the_content_not_of_the_packing(town_files, tmp_path):
    def sha256(files, method=zipfile.ZIP_DEFLATED, year=2026, folder="") -> str:
        path = tmp_path / "any.zip"
        with zipfile.ZipFile(path, "w", method) as archive:
            for name, text in files.items():
                archive.writestr(zipfile.ZipInfo(folder + name, (year, 1, 1, 0, 0, 0)), text)
        return read_feed([path], FeedSettings()).info.sha256

    plain = sha256(town_files)
    assert plain == sha256(town_files, zipfile.ZIP_STORED, 1999, "deep/er/")
    assert plain == sha256(dict(reversed(town_files.items())))
    windows = {name: "\ufeff" + text.replace("\n", "\r\n") for name, text in town_files.items()}
    assert plain == sha256(windows)
    for changed in (
        {"stops.txt": town_files["stops.txt"].replace("8.020", "8.021")},
        {"stop_times.txt": town_files["stop_times.txt"] + "b7a,07:08:00,07:08:00,tams,2\n"},
        {"routes.txt": town_files["routes.txt"].replace("route_color", "route_colour")},
        {"fare_rules.txt": "fare_id\n"},
    ):
        assert plain != sha256({**town_files, **changed})


def test_several_feeds_are_read_as_one(town, table):
    west = town(RICH, "west.zip")
    east = town(
        {
            "feed_info.txt": (
                "feed_publisher_name,feed_lang,feed_start_date,feed_end_date\n"
                "East,de,20260316,20260322\n"
            ),
            "routes.txt": table("routes.txt").replace("Locks bus,3", "Locks bus,714"),
        },
        "east.zip",
    )
    both = read_feed([west, east], FeedSettings())
    alone = [read_feed([path], FeedSettings(date=both.info.service_date)) for path in (west, east)]
    assert faults(both) == ()
    for number, part in enumerate(alone, start=1):
        prefix = f"{number}:"
        assert [prefix + s.id for s in part.stops] == [
            s.id for s in both.stops if s.id.startswith(prefix)
        ]
        assert [p.departures_s for p in part.patterns] == [
            p.departures_s for p in both.patterns if p.route_id.startswith(prefix)
        ]
        assert {prefix + f.file for f in part.findings} == {
            f.file for f in both.findings if f.file.startswith(prefix)
        }
    assert {t.from_stop_id for t in both.transfers} == {"1:gate", "1:tams"}
    assert both.shapes.keys() == {"1:up", "2:up"}
    assert {r.agency_id for r in both.routes} == {"1:oulm", "2:oulm"}
    assert ("route", "2:b7") in {(item.kind, item.id) for item in both.left_out}
    info = both.info
    assert (info.start_date, info.end_date) == ("2026-03-16", "2026-03-22")
    assert (info.publisher, info.lang, info.service_date) == ("East", "de", "2026-03-16")
    assert info.sha256 not in {part.info.sha256 for part in alone}


def test_feeds_that_share_no_date_are_refused(town, table):
    later = town({"calendar.txt": table("calendar.txt").replace("202603", "202703")}, "later.zip")
    told = r"share no date.*1:town.zip: 2026-03-02 to 2026-03-28; 2:later.zip: 2027-03-02"
    with pytest.raises(FeedError, match=told):
        read_feed([town(), later], FeedSettings())


def test_an_error_in_one_of_several_feeds_says_which(town, table):
    bad = town({"stops.txt": table("stops.txt").encode("utf-16")}, "bad.zip")
    with pytest.raises(FeedError) as caught:
        read_feed([town(), bad], FeedSettings())
    assert caught.value.file == "2:stops.txt"


def test_no_path_is_wrong_usage():
    with pytest.raises(UsageError, match="No feed"):
        read_feed([], FeedSettings())


class Listener(Silent):
    """Progress that counts what it hears."""

    def __init__(self) -> None:
        self.total, self.done, self.notes = 0, 0, []

    def phase(self, name: str, total: int | None = None) -> None:  # noqa: ARG002 - the protocol's
        """Add to the steps expected."""
        self.total += total or 0

    def step(self, count: int = 1) -> None:
        """Add to the steps done."""
        self.done += count

    def note(self, text: str) -> None:
        """Keep what is said."""
        self.notes.append(text)


def test_progress_is_told(town):
    listener = Listener()
    timetable = read_feed([town(), town()], FeedSettings(), progress=listener)
    assert listener.done == listener.total > 0
    assert listener.notes == [timetable.info.service_reason]
