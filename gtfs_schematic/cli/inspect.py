"""Command `inspect`: what is in a feed, what is wrong with it, what a diagram would hold."""

from __future__ import annotations

import json
from collections import Counter
from dataclasses import asdict
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from gtfs_schematic.cli import advice, options, words
from gtfs_schematic.cli.console import listening

if TYPE_CHECKING:
    from gtfs_schematic.network.model import Line, Network

_EPILOG = """\b
Example:
  gtfs-schematic inspect feed.zip --date 2026-03-11
  gtfs-schematic inspect feed.zip --json > feed.json
"""

_KINDS = {
    "all-day": "",
    "peak": "; in the peak only",
    "night": "; at night only",
    "some-days": "; on some days only",
}

_LONGEST_HEADWAY_S = 2 * 3600


@click.command(epilog=_EPILOG)
@options.feeds
@options.feed_options
@options.as_json
@click.option(
    "--geojson",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Also write the network as GeoJSON, to look at on a map.",
)
@click.option(
    "--graphml",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Also write the network as GraphML, for programs that study graphs.",
)
@click.option("--all", "everything", is_flag=True, help="List everything left out and found.")
@options.quiet
def inspect(
    feeds: tuple[Path, ...],
    geojson: Path | None,
    graphml: Path | None,
    **given: Any,  # noqa: ANN401 - the options of the registry
) -> None:
    """Show what is in FEED, what is wrong with it, and what a diagram of it would hold.

    FEED is a GTFS zip file or a folder; several are taken as one network.
    """
    settings = options.settings_from(given)
    from gtfs_schematic.network.export import to_geojson, to_graphml
    from gtfs_schematic.pipeline import inspect as read

    with listening(quiet=given["quiet"]) as progress:
        _, network = read(feeds, settings, progress=progress)
    if not given["quiet"]:
        advice.tell_expiry(network.info)
    if geojson is not None:
        options.write_file(geojson, to_geojson(network))
    if graphml is not None:
        options.write_file(graphml, to_graphml(network))
    if given["as_json"]:
        click.echo(to_json(network))
    else:
        click.echo("\n".join(describe(network, everything=given["everything"])))


def to_json(network: Network) -> bytes:
    """Write what a feed holds, for machines."""
    from gtfs_schematic.network.between import from_station_to_station, part_service_of

    document = {
        "service_date": network.info.service_date,
        "service_reason": network.info.service_reason,
        "publisher": network.info.publisher,
        "version": network.info.version,
        "start_date": network.info.start_date,
        "end_date": network.info.end_date,
        "agencies": list(network.agencies),
        "modes": dict(sorted(Counter(line.mode for line in network.lines).items())),
        "lines": [
            {
                "id": line.id,
                "name": line.name,
                "mode": line.mode,
                "route_ids": list(line.route_ids),
                "trips": line.trips,
                "service": line.service,
                "first_departure_s": line.first_departure_s,
                "last_departure_s": line.last_departure_s,
                "headway_s": line.headway_s,
                "periods": [asdict(period) for period in line.periods],
                "part_service": [
                    {"from": start, "to": end, "service": service}
                    for start, end, service in part_service_of(network, line)
                ],
            }
            for line in network.lines
        ],
        "stations": len(network.stations),
        "interchange_groups": network.groups,
        "links": len(from_station_to_station(network)),
        "junctions": len(network.junctions),
        "left_out": [asdict(item) for item in network.left_out],
        "findings": [asdict(finding) for finding in network.findings],
        "suggestions": advice.suggestions(network),
    }
    return json.dumps(document, ensure_ascii=False, indent=1).encode()


def describe(network: Network, *, everything: bool) -> list[str]:
    """Write what a feed holds, for people."""
    info = network.info
    where = "--all lists them"
    name = info.publisher or ", ".join(network.agencies) or "unknown publisher"
    until = " to ".join(date for date in (info.start_date, info.end_date) if date)
    version = f", version {info.version}" if info.version else ""
    return [
        f"Feed: {name}{version}{f', valid {until}' if until else ''}",
        f"Agencies: {', '.join(network.agencies) or 'none named'}",
        words.service_date(info),
        f"Modes: {_modes(network)}",
        f"Network: {words.size(network)}",
        "Lines:",
        *(f"  {_line(line, network)}" for line in sorted(network.lines, key=_rank)),
        *words.left_out(network.left_out, everything=everything, where=where),
        *words.findings(network.findings, everything=everything, where=where),
        *(f"Suggestion: {each}" for each in advice.suggestions(network)),
    ]


def _modes(network: Network) -> str:
    modes = Counter(line.mode for line in network.lines)
    return ", ".join(f"{mode} ({words.count(modes[mode], 'line')})" for mode in sorted(modes))


def _rank(line: Line) -> tuple[object, ...]:
    """Give what lines are sorted by for people: mode, the feed's wish, name."""
    from gtfs_schematic.network.naming import natural_key

    wish = (1, 0) if line.sort_order is None else (0, line.sort_order)
    return (line.mode, wish, natural_key(line.name), line.id)


def _line(line: Line, network: Network) -> str:
    longest = max(line.itineraries, key=len, default=())
    ends = [network.station[key].name for key in (longest[0], longest[-1])] if longest else []
    course = f": {' – '.join(dict.fromkeys(ends))}" if ends else ""
    stations = len({key for itinerary in line.itineraries for key in itinerary})
    return (
        f"{line.name} ({line.mode}){course}, {words.count(stations, 'station')}, "
        f"{words.count(line.trips, 'trip')}, {_span(line)}{_headway(line)}{_KINDS[line.service]}"
    )


def _span(line: Line) -> str:
    first, last = _clock(line.first_departure_s), _clock(line.last_departure_s)
    return f"at {first}" if first == last else f"{first} to {last}"


def _headway(line: Line) -> str:
    """Write how often a line runs; a few trips a day are told by their number alone."""
    if line.headway_s is None or line.headway_s > _LONGEST_HEADWAY_S:
        return ""
    return f", every {_minutes(line.headway_s)}{_headways(line)}"


def _headways(line: Line) -> str:
    """Write headways by period where they are not all the same."""
    known = [(p.period, p.headway_s) for p in line.periods if p.headway_s is not None]
    if len({headway for _, headway in known}) < 2:
        return ""
    return f" ({', '.join(f'{period} {_minutes(headway)}' for period, headway in known)})"


def _clock(seconds: int) -> str:
    """Write a time of the service day; 25:10 is ten past one of the next morning."""
    return f"{seconds // 3600:02d}:{seconds % 3600 // 60:02d}"


def _minutes(seconds: int) -> str:
    return f"{seconds / 60:.0f} min" if seconds >= 60 else f"{seconds} s"
