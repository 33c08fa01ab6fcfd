"""Say in words why stations moved on the sheet."""

from __future__ import annotations

from collections.abc import Mapping

from gtfs_schematic.layout.revise import FRAME, Revised
from gtfs_schematic.network.model import Network

ANEW = "all is laid out anew"


def because(revised: Revised | None, network: Network) -> dict[str, str]:
    """Give per station that moved the reason; None: all was laid out anew."""
    if revised is None:
        return dict.fromkeys((station.id for station in network.stations), ANEW)
    ends = {link.id: (link.start, link.end) for link in network.links}
    ends |= {walk.id: (walk.start, walk.end) for walk in network.walks}
    names = {station.id: station.name for station in network.stations}
    return {each.station_id: _words(each.because, ends, names) for each in revised.moved}


def _words(cause: str, ends: Mapping[str, tuple[str, str]], names: Mapping[str, str]) -> str:
    if cause == FRAME:
        return "title, key and notes take more of the sheet"
    if cause in ends:
        start, end = ends[cause]
        return f"makes room for {names[start]} – {names[end]}"
    if cause in names:
        return f"makes room for {names[cause]} at its new place"
    return "everything is relaxed a little"
