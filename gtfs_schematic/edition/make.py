"""Make the edition of a labelled layout."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence

from gtfs_schematic.drift.timing import Timing
from gtfs_schematic.edition.links import links_of, parts_of
from gtfs_schematic.edition.model import (
    Edition,
    EditionFeed,
    EditionJunction,
    EditionLine,
    EditionStation,
    EditionWalk,
)
from gtfs_schematic.feed.model import FeedInfo, Finding, Timetable
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels.model import LabelledLayout
from gtfs_schematic.layout.model import Layout
from gtfs_schematic.network.model import Line, Network

_PLACES_MM = 4
_PLACES_DEGREES = 7


def edition_of(
    labelled: LabelledLayout,
    title: str,
    timing: Timing | None = None,
    stop_codes: Mapping[str, tuple[str, ...]] | None = None,
) -> Edition:
    """Make the edition that a labelled layout shows.

    Parameters
    ----------
    labelled
        The finished layout; sheet millimetres, y down.
    title
        Title of the edition, as on the sheet.
    timing
        When its lines run, so that journeys can be measured from the edition alone.
    stop_codes
        Per station id the codes at its stops (`stop_codes_of`).

    Returns
    -------
    Edition
        Sheet places to a tenth of a micrometre and degrees to a centimetre, so that what is
        written is what was measured.
    """
    timing = timing or Timing()
    bundled = labelled.bundled
    layout = bundled.layout
    network = layout.network
    return Edition(
        title=title,
        feed=_feed(network.info),
        width_mm=layout.sheet.width_mm,
        height_mm=layout.sheet.height_mm,
        stations=_stations(labelled, timing, stop_codes or {}),
        links=links_of(layout, bundled.orders, _path),
        lines=tuple(_line(line) for line in network.lines),
        left_out=tuple((item.kind, item.id, item.reason) for item in network.left_out),
        findings=tuple(sentence(finding) for finding in network.findings),
        walks=_walks(layout),
        patterns=timing.patterns,
        junctions=tuple(
            EditionJunction(j.id, j.lon, j.lat, *_path([layout.positions[j.id]])[0])
            for j in network.junctions
        ),
        parts=parts_of(layout, bundled.orders, _path),
        rotation_deg=layout.rotation_deg,
        angles=layout.angles,
    )


def sentence(finding: Finding) -> str:
    """Write a finding as one sentence that begins with how grave it is and where it stands."""
    severity = "note" if finding.severity == "info" else finding.severity
    return f"{severity}: {', '.join(_places(finding))}: {finding.message}"


def _places(finding: Finding) -> Iterable[str]:
    yield finding.file or "feed"
    if finding.row is not None:
        yield f"row {finding.row}"
    if finding.field is not None:
        yield f"field {finding.field}"
    if finding.value is not None:
        yield f"value {finding.value!r}"


def _feed(info: FeedInfo) -> EditionFeed:
    return EditionFeed(
        info.sha256,
        info.publisher,
        info.version,
        info.start_date,
        info.end_date,
        info.service_date,
    )


def stop_codes_of(timetable: Timetable, network: Network) -> dict[str, tuple[str, ...]]:
    """Give per station id the codes at its stops, sorted; stations without codes are left out."""
    codes = {stop.id: stop.code for stop in timetable.stops if stop.code}
    found = {
        station.id: tuple(sorted({codes[stop] for stop in station.stop_ids if stop in codes}))
        for station in network.stations
    }
    return {key: value for key, value in found.items() if value}


def _line(line: Line) -> EditionLine:
    return EditionLine(
        id=line.id,
        name=line.name,
        color=line.color,
        text_color=line.text_color,
        route_ids=line.route_ids,
        itineraries=line.itineraries,
        long_name=line.long_name,
        mode=line.mode,
        service=line.service,
        trips=line.trips,
        first_departure_s=line.first_departure_s,
        last_departure_s=line.last_departure_s,
        headway_s=line.headway_s,
    )


def _stations(
    labelled: LabelledLayout, timing: Timing, stop_codes: Mapping[str, tuple[str, ...]]
) -> tuple[EditionStation, ...]:
    layout = labelled.bundled.layout
    return tuple(
        EditionStation(
            id=station.id,
            name=station.name,
            stop_ids=station.stop_ids,
            lon=round(station.lon, _PLACES_DEGREES),
            lat=round(station.lat, _PLACES_DEGREES),
            x_mm=_mm(layout.positions[station.id][0]),
            y_mm=_mm(layout.positions[station.id][1]),
            kind=station.kind,
            lines=station.lines,
            group=station.group,
            label_side=labelled.labels[station.id].side if station.id in labelled.labels else "",
            change_s=timing.change_s.get(station.id),
            stop_codes=stop_codes.get(station.id, ()),
            second_name=station.second_name,
            boarding=station.boarding,
        )
        for station in layout.network.stations
    )


def _walks(layout: Layout) -> tuple[EditionWalk, ...]:
    return tuple(
        EditionWalk(walk.id, walk.start, walk.end, walk.time_s, _path(layout.walk_paths[walk.id]))
        for walk in layout.network.walks
    )


def _path(points: Sequence[Point]) -> tuple[Point, ...]:
    return tuple((_mm(x), _mm(y)) for x, y in points)


def _mm(value: float) -> float:
    """Round a sheet coordinate; no negative zero, so that equal editions have equal bytes."""
    return round(float(value), _PLACES_MM) + 0.0
