"""What a person merged, split, grouped and hid is known again when every id is another."""

from __future__ import annotations

import hashlib
from dataclasses import replace
from pathlib import Path

import changed_timetables as changes
import pytest

from gtfs_schematic import pipeline
from gtfs_schematic.drawing.model import DrawingSettings
from gtfs_schematic.drawing.palette import recolored
from gtfs_schematic.edition.adjusted import adjusted
from gtfs_schematic.edition.adjustments import Adjustments, adjustments_of, plain
from gtfs_schematic.edition.folder import load_beside, load_edition, write_folder
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.edition.state import State, from_json
from gtfs_schematic.edition.stops import same_stops
from gtfs_schematic.edition.succession import succeed
from gtfs_schematic.errors import EditionError
from gtfs_schematic.feed.model import Stop, Timetable
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.model import Network, NetworkSettings

ROOT = Path(__file__).parents[2]
QUICK = pipeline.Settings.model_validate({"layout": {"effort": "quick"}})
SAID = adjustments_of(
    {
        "stations": {
            "183": {"name": "Mulg Halt", "label_side": "S"},
            "335-1": {"hide": True, "note": "works"},
            "152-B1": {"label_side": "N"},
            "106": {"pin_from": {"station": "343-1", "dy_mm": 0}},
        },
        "lines": {"b9": {"color": "#225577"}, "n1": {"hide": True}},
        "links": [{"between": ["101", "121"], "order": ["m4", "m3"]}],
        "group": [{"lines": ["t5", "t6"], "name": "T"}],
        "merge": [{"stations": ["331-1", "332-1"], "name": "Both"}],
        "split": [
            {
                "station": "152",
                "parts": [
                    {"stops": ["152-U1", "152-U2"]},
                    {"stops": ["152-B1", "152-B2"], "name": "Bus stand"},
                ],
            }
        ],
    },
    "test",
)


@pytest.fixture(scope="module")
def drawn() -> pipeline.Result:
    return pipeline.draw(ROOT / "data" / "before.zip", QUICK, adjustments=SAID)


@pytest.fixture(scope="module")
def state(drawn: pipeline.Result) -> State:
    return from_json(drawn.state, drawn.edition)


def network_of(timetable: Timetable) -> Network:
    return recolored(build_network(timetable, NetworkSettings()), DrawingSettings())


def described(network: Network) -> list[tuple[object, ...]]:
    """Give all that a rider sees of a network, without an id."""
    names = {s.id: (s.name, s.lon, s.lat) for s in network.stations}
    lines = {k.id: k.name for k in network.lines}
    rows: list[tuple[object, ...]] = [
        (*names[s.id], s.kind, sorted(lines[k] for k in s.lines)) for s in network.stations
    ]
    rows += [
        (k.name, k.trips, k.headway_s, sorted(min([*map(names.get, i)], [*map(names.get, i[::-1])])
         for i in k.itineraries)) for k in network.lines
    ]  # fmt: skip
    return sorted(rows, key=repr)


def changed(timetable: Timetable, name: str) -> Timetable:
    start = changes.unchanged(timetable)
    return getattr(changes, name)(start, changes.chance_of(4)).timetable


@pytest.mark.parametrize("change", ["renumber_all", "permute_all", "renumber_some"])
def test_everything_is_adjusted_again_whatever_the_ids(drawn, state, change):
    timetable = changed(drawn.timetable, change)
    done = succeed(drawn.edition, state, (timetable, network_of(timetable)), SAID)
    assert done.adjusted.stale == ()
    assert described(done.adjusted.network) == described(drawn.network)
    assert {s.id for s in done.raw.stations} == {s.id for s in state.network.stations}
    drawn_ids = {s.id for s in drawn.edition.stations}
    kept = {s.id for s in done.adjusted.network.stations}
    assert drawn_ids == kept
    assert done.adjusted.wishes.orders == {"101~121": ("m4", "m3")}
    assert set(done.adjusted.wishes.sides.values()) == {"S", "N"}
    assert set(done.matches.stations) == kept & drawn_ids
    # The adjustments of the new edition apply to its own network, again and again.
    once_more = adjusted(done.raw, done.adjustments, timetable)
    assert once_more.network == done.adjusted.network


def test_with_ids_kept_nothing_is_rewritten(drawn, state):
    done = succeed(drawn.edition, state, (drawn.timetable, network_of(drawn.timetable)), SAID)
    assert done.adjustments == SAID
    assert done.adjusted.network.stations == drawn.network.stations
    assert done.adjusted.network.lines == drawn.network.lines


def test_without_a_state_ids_tell(drawn):
    done = succeed(drawn.edition, None, (drawn.timetable, network_of(drawn.timetable)), SAID)
    assert described(done.adjusted.network) == described(drawn.network)


def test_a_state_is_read_as_it_was_written(drawn, state, tmp_path):
    assert state.network.stations == network_of(drawn.timetable).stations
    assert adjusted(state.network, SAID, state.timetable).network == drawn.network
    write_folder(tmp_path / "e", pipeline.files_of(drawn))
    edition = load_edition(tmp_path / "e")
    assert load_beside(tmp_path / "e" / "edition.json", edition).state == state
    (tmp_path / "e" / "state.json").write_bytes(drawn.state + b" ")
    with pytest.raises(EditionError, match="not the one"):
        load_beside(tmp_path / "e", edition)
    (tmp_path / "e" / "state.json").unlink()
    assert load_beside(tmp_path / "e", edition).state is None
    assert plain(SAID) == edition.adjustments


@pytest.mark.parametrize("data", [b"{}", b"3", b"{", b'{"format": "x"}'])
def test_what_is_no_state_is_refused(drawn, data):
    edition: Edition = replace(drawn.edition, state_sha256=hashlib.sha256(data).hexdigest())
    with pytest.raises(EditionError, match=r"state\.json"):
        from_json(data, edition)


def test_stops_are_matched_by_place_where_ids_are_others():
    def stop(key: str, lon: float, platform: str) -> Stop:
        return Stop(key, "Quay", "", lon, 0.0, 0, None, "unknown", platform_code=platform)

    old = [stop("a", 0.0, "1"), stop("b", 0.001, "2"), stop("c", 0.002, "3")]
    new = [stop("c", 0.0, "1"), stop("y", 0.001, "2"), stop("z", 0.02, "3")]
    pairs = [(("a", "b", "c"), ("c", "y", "z"))]
    # The id c is exchanged: place and platform say so together; z is 2 km off.
    assert same_stops(old, new, pairs) == {"a": "c", "b": "y"}
    assert same_stops(old, old, [(("a", "b", "c"), ("a", "b", "c"))]) == {k: k for k in "abc"}
    assert same_stops(old, new, [(("a",), ())]) == {}


def test_no_adjustment_is_carried_as_none(drawn, state):
    said = Adjustments()
    done = succeed(drawn.edition, state, (drawn.timetable, network_of(drawn.timetable)), said)
    assert (done.adjustments, done.adjusted.stale) == (said, ())
    assert done.adjusted.network == done.raw
