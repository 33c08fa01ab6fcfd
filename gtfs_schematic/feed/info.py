"""Reading feed_info.txt, attributions.txt and translations.txt."""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace
from functools import partial

from gtfs_schematic.feed.cells import Cell, name_of, value_of
from gtfs_schematic.feed.model import Stop
from gtfs_schematic.feed.tables import Tables
from gtfs_schematic.feed.values import clean_name, parse_date


@dataclass(frozen=True, slots=True)
class Imprint:
    """What feed_info.txt says; dates None where it says nothing usable."""

    publisher: str = ""
    version: str = ""
    lang: str = ""
    start: dt.date | None = None
    end: dt.date | None = None


@dataclass(frozen=True)
class StopNames:
    """Names of stops in one other language."""

    by_id: Mapping[str, str] = field(default_factory=dict)
    by_name: Mapping[str, str] = field(default_factory=dict)

    def translated(self, stop: Stop) -> Stop:
        """Give the stop with its second name, "" if there is none or it is the first name."""
        other = self.by_id.get(stop.id) or self.by_name.get(stop.name) or ""
        return stop if other in ("", stop.name) else replace(stop, second_name=other)


def read_imprint(tables: Tables) -> Imprint:
    """Give the first row of feed_info.txt; nothing if the feed has none."""
    columns = (
        "feed_publisher_name",
        "feed_version",
        "feed_lang",
        "feed_start_date",
        "feed_end_date",
    )
    file = "feed_info.txt"
    for row, (publisher, version, lang, start, end) in tables.rows(file, columns):
        at = partial(Cell, file, row)
        fault = "not a date as YYYYMMDD; it does not count"
        return Imprint(
            name_of(tables.notebook, at("feed_publisher_name", publisher)),
            clean_name(version),
            lang,
            value_of(tables.notebook, at("feed_start_date", start), parse_date, fault),
            value_of(tables.notebook, at("feed_end_date", end), parse_date, fault),
        )
    return Imprint()


def read_languages(tables: Tables) -> list[str]:
    """Give the languages that the feed and its agencies name, the feed's first; tags or ""."""
    silent = tables.without_findings()
    columns = (("feed_info.txt", ("feed_lang",)), ("agency.txt", ("agency_lang",)))
    return [tag for file, column in columns for _, (tag,) in silent.rows(file, column)]


def read_attributions(
    tables: Tables, agency_ids: Iterable[str], route_ids: Iterable[str]
) -> tuple[str, ...]:
    """Give the organizations to be credited for the whole feed or for a part that is drawn."""
    agencies, routes = frozenset(agency_ids), frozenset(route_ids)
    names = set()
    columns = ("organization_name", "agency_id", "route_id", "trip_id")
    file = "attributions.txt"
    for row, (name, agency, route, trip) in tables.rows(file, columns):
        whole_feed = not (agency or route or trip)
        if name and (whole_feed or agency in agencies or route in routes):
            names.add(name_of(tables.notebook, Cell(file, row, "organization_name", name)))
    return tuple(sorted(names))


def read_stop_names(tables: Tables, language: str) -> StopNames:
    """Give the translations of stop names into a language.

    Understands the table of the GTFS Schedule reference (table_name, field_name, language,
    translation, record_id or field_value) and the older one (trans_id, lang, translation),
    whose trans_id is the text to be replaced. Of several tags that fit, one is taken for the
    whole feed: the tag asked for, else the first with more subtags ("fr" takes "fr-CA"), else
    the longest with fewer (RFC 4647, lookup). By id wins over by name.
    """
    found: dict[str, tuple[dict[str, str], dict[str, str]]] = {}
    for tag, record, old_name, translation in _translations(tables) if language else ():
        by_id, by_name = found.setdefault(tag.lower(), ({}, {}))
        if record:
            by_id.setdefault(record, translation)
        else:
            by_name.setdefault(old_name, translation)
    best = _best_tag(language.lower(), found)
    if language and not best:
        known = f"there is {', '.join(sorted(found))}" if found else "there is no other"
        fault = f"no name of a stop is translated into the language asked for; {known}"
        tables.notebook.find("warning", "translations.txt", fault, field="language", value=language)
    return StopNames(*found[best]) if best else StopNames()


def _translations(tables: Tables) -> Iterable[tuple[str, str, str, str]]:
    """Yield language, stop id, stop name (one of the two is "") and translation."""
    file = "translations.txt"
    columns = (
        "translation",
        "table_name",
        "field_name",
        "language",
        "record_id",
        "field_value",
        "lang",
        "trans_id",
    )
    for row, (text, table, name, tag, record, value, old_tag, old_name) in tables.rows(
        file, columns
    ):
        if (table, name) == ("stops", "stop_name"):
            key = (tag, record, "" if record else clean_name(value))
        elif old_tag or old_name:
            key = (old_tag, "", clean_name(old_name))
        else:
            continue
        translation = name_of(tables.notebook, Cell(file, row, "translation", text))
        if key[0] and any(key[1:]) and translation:
            yield *key, translation
        else:
            fault = "row lacks a language, a translation or what is translated; it does not count"
            tables.notebook.find("warning", file, fault, row=row)


def _best_tag(wanted: str, present: Iterable[str]) -> str:
    tags = sorted(present)
    if not wanted:
        return ""
    narrower = [tag for tag in tags if tag.startswith(f"{wanted}-")]
    wider = [tag for tag in tags if wanted.startswith(f"{tag}-")]
    exact = [tag for tag in tags if tag == wanted]
    return next(iter(exact or narrower or sorted(wider, key=len, reverse=True)), "")
