"""Say what of a revision is marked on its sheet."""

from __future__ import annotations

from gtfs_schematic.drawing.marks import (
    ClosedStation,
    Marks,
    last_day,
    still_closed,
    words_of,
)
from gtfs_schematic.drawing.model import DrawingSettings
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.edition.state import State
from gtfs_schematic.edition.succession import Succession


def marks_after(
    before: Edition, state: State | None, done: Succession, settings: DrawingSettings
) -> Marks:
    """Give the marks of the edition that follows another.

    What a person hid, merged or split is neither closed nor new.

    Parameters
    ----------
    before
        The edition before.
    state
        What is kept beside it: where names stood, and what had closed before it.
    done
        The new network, and what of it is the same.
    settings
        Whether and how long things are marked.
    """
    network, matches = done.adjusted.network, done.matches
    info = network.info
    start = info.start_date or info.service_date
    known = {m.new_id for m in (*matches.split_stations, *matches.merged_stations)}
    stations = {
        s.id: words_of(settings.mark_new, start)
        for s in network.stations
        if s.id not in matches.stations and s.id not in known
    }
    split = {m.new_id for m in matches.split_lines}
    lines = {
        k.id: words_of(settings.mark_new, start)
        for k in network.lines
        if k.id not in matches.lines and k.id not in split
    }
    marked = bool(settings.mark_new)
    closed = still_closed(_closed(before, state, done, settings, start), network.station, start)
    return Marks(stations if marked else {}, lines if marked else {}, closed, bool(closed))


def _closed(
    before: Edition,
    state: State | None,
    done: Succession,
    settings: DrawingSettings,
    start: str,
) -> list[ClosedStation]:
    until = last_day(settings.show_closed, start)
    if not until:
        return []
    raw = {s.id for s in done.raw.stations}
    merged = {m.old_id for m in done.matches.merged_stations}
    labels = state.drawn.labels if state is not None else {}
    earlier = list(state.marks.closed) if state is not None else []
    return earlier + [
        ClosedStation(s.id, s.name, (s.x_mm, s.y_mm), until, labels.get(s.id))
        for s in before.stations
        if s.id not in raw and s.id not in merged
    ]
