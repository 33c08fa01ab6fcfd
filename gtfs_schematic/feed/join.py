"""Joining the timetables of several feeds into one."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace
from itertools import chain

from gtfs_schematic.feed.digest import joint_sha256
from gtfs_schematic.feed.findings import Notebook
from gtfs_schematic.feed.model import FeedInfo, Pattern, Timetable, Transfer
from gtfs_schematic.feed.patterns import pattern_key
from gtfs_schematic.feed.ways import transfer_key


def join_timetables(
    parts: Sequence[tuple[str, Timetable]], unused: Sequence[Notebook]
) -> Timetable:
    """Join timetables of the same dates.

    Parameters
    ----------
    parts
        Timetables with the prefix that their ids get; findings and things left out carry it
        already.
    unused
        What is noted of feeds of which nothing is drawn.
    """
    if len(parts) == 1 and not parts[0][0]:
        return parts[0][1]
    prefixed = [_prefixed(part, prefix) for prefix, part in parts]
    return Timetable(
        _joint_info([part.info for _, part in parts]),
        tuple(sorted(chain(*(p.agencies for p in prefixed)), key=lambda item: item.id)),
        tuple(sorted(chain(*(p.stops for p in prefixed)), key=lambda item: item.id)),
        tuple(sorted(chain(*(p.routes for p in prefixed)), key=lambda item: item.id)),
        tuple(sorted(chain(*(p.patterns for p in prefixed)), key=pattern_key)),
        tuple(sorted(chain(*(p.transfers for p in prefixed)), key=transfer_key)),
        {ident: shape for p in prefixed for ident, shape in p.shapes.items()},
        {ident: days for p in prefixed for ident, days in p.operating_days.items()},
        tuple(chain(*(p.findings for p in prefixed), *(notes.findings for notes in unused))),
        tuple(
            sorted(
                chain(*(p.left_out for p in prefixed), *(notes.left_out for notes in unused)),
                key=lambda item: (item.kind, item.id),
            )
        ),
    )


def _prefixed(part: Timetable, prefix: str) -> Timetable:
    return replace(
        part,
        agencies=tuple(replace(a, id=prefix + a.id) for a in part.agencies),
        stops=tuple(
            replace(s, id=prefix + s.id, parent_id=s.parent_id and prefix + s.parent_id)
            for s in part.stops
        ),
        routes=tuple(
            replace(
                r,
                id=prefix + r.id,
                agency_id=prefix + r.agency_id,
                network_id=r.network_id and prefix + r.network_id,
            )
            for r in part.routes
        ),
        patterns=tuple(_prefixed_pattern(p, prefix) for p in part.patterns),
        transfers=tuple(
            Transfer(prefix + t.from_stop_id, prefix + t.to_stop_id, t.transfer_type, t.min_time_s)
            for t in part.transfers
        ),
        shapes={prefix + ident: shape for ident, shape in part.shapes.items()},
        operating_days={prefix + ident: days for ident, days in part.operating_days.items()},
    )


def _prefixed_pattern(pattern: Pattern, prefix: str) -> Pattern:
    return replace(
        pattern,
        route_id=prefix + pattern.route_id,
        shape_id=pattern.shape_id and prefix + pattern.shape_id,
        stop_ids=tuple(prefix + ident for ident in pattern.stop_ids),
    )


def _joint_info(infos: Sequence[FeedInfo]) -> FeedInfo:
    """Join what is said about the feeds; they hold together while all of them hold."""
    languages = sorted({info.lang for info in infos if info.lang})
    return replace(
        infos[0],
        sha256=joint_sha256([info.sha256 for info in infos]),
        publisher=_listed(info.publisher for info in infos),
        version=_listed(info.version for info in infos),
        start_date=max(info.start_date for info in infos),
        end_date=min(info.end_date for info in infos),
        # "mul" stands for several languages (ISO 639-2), as in feed_info.txt.
        lang=languages[0] if len(languages) == 1 else "mul" if languages else "",
        attributions=tuple(sorted({name for info in infos for name in info.attributions})),
    )


def _listed(texts: Iterable[str]) -> str:
    """List texts once each, in order, with semicolons."""
    return "; ".join(dict.fromkeys(text for text in texts if text))
