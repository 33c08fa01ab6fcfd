"""Keeping only the routes asked for: by mode, agency, name or id, and number of trips."""

from __future__ import annotations

import difflib
from collections import Counter
from collections.abc import Iterable, Mapping, Sequence

from gtfs_schematic.errors import UsageError
from gtfs_schematic.feed.findings import Notebook
from gtfs_schematic.feed.model import Agency, FeedSettings, Pattern, Route
from gtfs_schematic.feed.modes import MODES, REPLACEMENT, refusal

_LISTED = 12


def check_modes(settings: FeedSettings) -> None:
    """Refuse modes that there are not.

    Raises
    ------
    UsageError
        Naming the ones that there are.
    """
    unknown = sorted(set(settings.modes) - {*MODES, REPLACEMENT})
    if unknown:
        raise UsageError(
            f"There is no mode {unknown[0]!r}. Modes are {', '.join((*MODES, REPLACEMENT))}."
        )


def keep_routes(
    notebook: Notebook,
    routes: Mapping[str, Route],
    agencies: Mapping[str, Agency],
    settings: FeedSettings,
) -> dict[str, Route]:
    """Give the routes asked for; the others are noted as left out, with the reason."""
    kept = {}
    for ident, route in routes.items():
        agency = agencies.get(route.agency_id)
        own = names_of_agency(notebook.prefix, route.agency_id, agency)
        names = names_of_route(notebook.prefix, route)
        reason = refusal(route.route_type, route.mode, settings.modes)
        if reason is None and settings.agencies and not own & set(settings.agencies):
            operator = agency.name if agency else route.agency_id
            reason = f"agency {operator} is not among those asked for"
        if reason is None and settings.routes and not names & set(settings.routes):
            reason = "it is not among the routes asked for"
        if reason is None and names & set(settings.without_routes):
            reason = "it is among the routes not wanted"
        if reason:
            notebook.leave_out("route", ident, reason)
        else:
            kept[ident] = route
    return kept


def names_of_agency(prefix: str, ident: str, agency: Agency | None) -> set[str]:
    """Give what an agency may be asked for by: its id, with and without prefix, or its name."""
    return {ident, prefix + ident, *([agency.name] if agency else [])} - {""}


def names_of_route(prefix: str, route: Route) -> set[str]:
    """Give what a route may be asked for by: its id, with and without prefix, or a name."""
    return {route.id, prefix + route.id, route.short_name, route.long_name} - {""}


def check_names(
    settings: FeedSettings, agencies: Iterable[set[str]], routes: Iterable[set[str]]
) -> None:
    """Refuse agencies and routes that no feed has.

    Parameters
    ----------
    agencies, routes
        The names of each one in all feeds.

    Raises
    ------
    UsageError
        Naming the nearest, or the first ones that there are.
    """
    every_route = list(routes)
    for kind, asked, known in (
        ("agency", settings.agencies, list(agencies)),
        ("route", settings.routes, every_route),
        ("route", settings.without_routes, every_route),
    ):
        names = sorted(set().union(*known))
        for wanted in asked:
            if wanted not in names:
                near = difflib.get_close_matches(wanted, names, 3)
                listed = ", ".join(near or names[:_LISTED])
                more = "" if near or len(names) <= _LISTED else ", …"
                told = f"Did you mean {listed}?" if near else f"There are {listed}{more}."
                raise UsageError(f"No {kind} has the id or name {wanted!r}. {told}")


def without_rare_routes(
    notebook: Notebook,
    patterns: Sequence[Pattern],
    routes: Mapping[str, Route],
    min_trips: int,
    when: str,
) -> tuple[Pattern, ...]:
    """Leave out routes with fewer trips, and note them.

    Routes of one agency with the same short name are one line to riders, and count together.
    """

    def line(ident: str) -> tuple[str, str, str]:
        route = routes[ident]
        return (route.agency_id, route.short_name, "" if route.short_name else ident)

    trips: Counter[tuple[str, str, str]] = Counter()
    for pattern in patterns:
        trips[line(pattern.route_id)] += len(pattern.departures_s)
    rare = {p.route_id for p in patterns if trips[line(p.route_id)] < min_trips}
    for ident in sorted(rare):
        count = trips[line(ident)]
        told = f"{count} trip{'' if count == 1 else 's'} {when}, fewer than {min_trips}"
        notebook.leave_out("route", ident, f"its line has {told}")
    return tuple(p for p in patterns if p.route_id not in rare)
