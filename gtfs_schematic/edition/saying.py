"""Say one thing more, or take something back, in adjustments that hold."""

from __future__ import annotations

import copy
from collections.abc import Mapping, Sequence
from typing import Any

from gtfs_schematic.edition.adjustments import Adjustments, adjustments_of, plain
from gtfs_schematic.errors import UsageError
from gtfs_schematic.network.model import Network

EVERYTHING = "all"


def with_saying(
    adjustments: Adjustments,
    about: tuple[str, Sequence[str]],
    values: Mapping[str, Any],
    drop: Sequence[str] = (),
) -> Adjustments:
    """Give adjustments that say something more of one thing.

    Parameters
    ----------
    adjustments
        What holds.
    about
        Kind of thing ("stations", "lines", "links", "merge", "split", "group" or
        "abbreviations"), and the ids that name it.
    values
        What is said of it; what was said of it under the same names is replaced.
    drop
        Names of what is taken back, or "all".

    Raises
    ------
    UsageError
        If a value is wrong, nothing of the kind was said that could be taken back, or two
        adjustments contradict each other then; names both.
    """
    kind, ids = about
    tables: dict[str, Any] = copy.deepcopy(plain(adjustments))
    if kind in ("stations", "lines"):
        table = tables.setdefault(kind, {})
        table[ids[0]] = _said(table.get(ids[0], {}), values, drop, f"{kind}.{ids[0]}")
        if not table[ids[0]]:
            del table[ids[0]]
    elif kind == "abbreviations":
        table = tables.setdefault(kind, {})
        if drop:
            _taken_back(table, [ids[0]], kind)
        else:
            table[ids[0]] = values["short"]
    else:
        rows = tables.setdefault(kind, [])
        name, key = _KEYS[kind]
        row = next((each for each in rows if _ids(each[name]) == _order(kind, ids)), None)
        fresh = _said(dict(row or {}), values, drop, f"{kind} {' '.join(ids)}")
        kept = [each for each in rows if each is not row]
        if fresh and not (set(fresh) <= {name} and kind in ("links", "split")):
            fresh[name] = list(ids) if key is list else ids[0]
            kept.append(fresh)
        elif not drop and kind in ("merge", "group"):
            kept.append({name: list(ids)})
        tables[kind] = kept
    cleaned = {key: value for key, value in tables.items() if value}
    return adjustments_of(cleaned, "adjustments")


_KEYS: Mapping[str, tuple[str, type]] = {
    "links": ("between", list),
    "merge": ("stations", list),
    "group": ("lines", list),
    "split": ("station", str),
}


def _ids(value: str | Sequence[str]) -> frozenset[str]:
    return frozenset([value] if isinstance(value, str) else value)


def _order(kind: str, ids: Sequence[str]) -> frozenset[str]:
    return frozenset(ids[:1] if kind == "split" else ids)


def _said(
    table: dict[str, Any], values: Mapping[str, Any], drop: Sequence[str], where: str
) -> dict[str, Any]:
    if EVERYTHING in drop:
        if not table:
            raise UsageError(f"{where}: nothing is said of it that could be taken back.")
        return {}
    _taken_back(table, drop, where)
    return {**table, **values}


def _taken_back(table: dict[str, Any], names: Sequence[str], where: str) -> None:
    for name in names:
        if name not in table:
            known = f"said are {', '.join(sorted(table))}" if table else "nothing is said of it"
            raise UsageError(f"{where}: {name} is not said, so it cannot be taken back; {known}.")
        del table[name]


def station_of(network: Network, text: str) -> str:
    """Give the id of a station by its id, one of its stops', or its name.

    Raises
    ------
    UsageError
        If there is none, or the name is that of several.
    """
    ids = {stop for s in network.stations for stop in s.stop_ids} | set(network.station)
    return _found(text, ids, {s.id: s.name for s in network.stations}, "station")


def line_of(network: Network, text: str) -> str:
    """Give the id of a line by its id, one of its routes', or its name; see `station_of`."""
    ids = {route for k in network.lines for route in k.route_ids} | set(network.line)
    return _found(text, ids, {k.id: k.name for k in network.lines}, "line")


def _found(text: str, ids: set[str], names: Mapping[str, str], noun: str) -> str:
    if text in ids:
        return text
    found = [key for key in sorted(names) if names[key].casefold() == text.casefold()]
    if len(found) == 1:
        return found[0]
    if found:
        raise UsageError(f"{text}: several {noun}s have this name: {', '.join(found)}. Give an id.")
    raise UsageError(
        f"{text}: no {noun} of the edition has this id or name; edition.json lists them."
    )
