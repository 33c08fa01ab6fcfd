"""Text that is not UTF-8: found with its bytes, and read in the most likely code."""

from __future__ import annotations

import io

import pytest

from gtfs_schematic.feed.check import faults
from gtfs_schematic.feed.encodings import escaped, is_damaged_utf8, legacy_codec, readable

# A name of each language in letters of its own, and its Windows code page (the list of standard
# encodings in Python's documentation of codecs names the languages of each).
NAMES = [
    ("en", "Café", "1252"),
    ("de-CH", "Zürich Süd", "1252"),
    ("", "Ålesund", "1252"),
    ("pl", "Łódź Główna", "1250"),
    ("cs", "Žižkov", "1250"),
    ("hu", "Győr", "1250"),
    ("ru", "Тверская", "1251"),
    ("uk-UA", "Київ", "1251"),
    ("bg", "София", "1251"),
    ("el", "Αθήνα", "1253"),
    ("tr", "Şişli", "1254"),
    ("he", "חיפה", "1255"),
    ("ar", "القاهرة", "1256"),
    ("lt", "Šiauliai", "1257"),
    ("vi", "Đông Hà", "1258"),
    ("th", "สยาม", "874"),
    ("ja", "東京", "932"),
    ("zh", "北京", "936"),
    ("zh-Hant", "臺北", "950"),
    ("ko", "서울", "949"),
]


def found(timetable):
    return [(f.severity, f.file, f.row, f.field, f.value) for f in timetable.findings]


@pytest.mark.parametrize(("tag", "name", "page"), NAMES)
def test_the_code_follows_the_language_of_the_feed(read_town, table, tag, name, page):
    agency = table("agency.txt").replace("Zurich,en", f"Zurich,{tag}")
    stops = table("stops.txt").replace("Tamselby", name).encode(f"cp{page}")
    timetable = read_town({"agency.txt": agency, "stops.txt": stops})
    assert {s.id: s.name for s in timetable.stops}["tams"] == name
    (finding,) = timetable.findings
    assert (finding.file, finding.row, finding.field) == ("stops.txt", 5, "stop_name")
    assert f"Windows code page {page}" in finding.message
    assert faults(timetable) == ()


def test_the_language_of_the_feed_wins_over_that_of_an_agency(read_town, table):
    info = "feed_publisher_name,feed_publisher_url,feed_lang\nO,https://o.example,pl\n"
    stops = table("stops.txt").replace("Tamselby", "Łódź").encode("cp1250")
    timetable = read_town({"feed_info.txt": info, "stops.txt": stops})
    assert "Łódź" in {stop.name for stop in timetable.stops}


def test_the_finding_has_the_bytes_as_escapes(read_town, table):
    stops = table("stops.txt").replace("Tamselby", "Tämselbö").encode("latin-1")
    assert found(read_town({"stops.txt": stops})) == [
        ("warning", "stops.txt", 5, "stop_name", r"T\xe4mselb\xf6")
    ]


def test_ids_stay_joined_though_only_some_tables_are_utf8(read_town, table):
    names = ("stops.txt", "stop_times.txt", "trips.txt", "shapes.txt", "routes.txt")
    texts = {n: table(n).replace("tams", "täms").replace("up", "üp") for n in names}
    texts["routes.txt"] = texts["routes.txt"].replace("t1,", "tö1,")
    texts["trips.txt"] = texts["trips.txt"].replace("t1,", "tö1,")
    plain = read_town(texts)
    for old in ({"stops.txt"}, {"trips.txt", "stop_times.txt"}, {"shapes.txt", "routes.txt"}):
        codes = {n: "latin-1" if n in old else "utf-8" for n in names}
        timetable = read_town({n: text.encode(codes[n]) for n, text in texts.items()})
        assert timetable.stops == plain.stops
        assert timetable.patterns == plain.patterns
        assert timetable.routes == plain.routes
        assert timetable.shapes.keys() == plain.shapes.keys()
        assert {f.file for f in timetable.findings} == old


def test_damage_within_utf8_is_no_other_code(read_town, table):
    """Most of the file is UTF-8 beyond ASCII, so a lone byte is damage, not a letter."""
    text = table("stops.txt").replace("Parvinholm", "Pärvinhölm").replace("Oulmgate", "Öulmgate")
    data = text.encode().replace(b"Tamselby", b"Tams\xc3")
    timetable = read_town({"stops.txt": data})
    names = {stop.id: stop.name for stop in timetable.stops}
    assert (names["parv"], names["tams"]) == ("Pärvinhölm", "Tams\ufffd")
    assert found(timetable) == [("warning", "stops.txt", 5, "stop_name", r"Tams\xc3")]


def test_ids_read_alike_in_damaged_tables_and_in_others(read_town, table):
    """All lines of stop_times.txt beyond ASCII are bad, most of stops.txt are good."""
    text = table("stops.txt").replace("Parvinholm", "Pärvinhölm").replace("Oulmgate", "Öulmgate")
    stops, times = (
        data.replace(b"tams,", b"st\xc3,").replace(b"vend,", b"st\x81,")
        for data in (text.encode(), table("stop_times.txt").encode())
    )
    timetable = read_town({"stops.txt": stops, "stop_times.txt": times})
    assert {stop.id for stop in timetable.stops} >= {"stÃ", r"st\x81"}
    assert timetable.patterns[1].stop_ids == ("gate1", "stÃ", r"st\x81", "parv")
    assert {f.severity for f in timetable.findings} == {"warning"}


def test_bytes_that_no_code_has_leave_a_mark(read_town, table):
    """Windows-1252 has no 0x81 (from memory)."""
    data = table("stops.txt").encode().replace(b"Tamselby", b"Tams\x81lby")
    timetable = read_town({"stops.txt": data})
    assert "Tams\ufffdlby" in {stop.name for stop in timetable.stops}


def test_columns_that_are_not_used_are_only_noted(read_town, table):
    head, row = table("agency.txt").splitlines()
    text = f"{head},agency_note\n{row},é\n".encode("latin-1")
    assert found(read_town({"agency.txt": text})) == [
        ("info", "agency.txt", 2, "agency_note", r"\xe9")
    ]


def test_damage_is_told_from_another_code_by_the_lines():
    latin = "a\nZürich\nGenève\n".encode("latin-1")
    assert not is_damaged_utf8(io.BytesIO(latin))
    assert is_damaged_utf8(io.BytesIO("Zürich\nGenève\n".encode() + b"Caf\xe9\n"))


def test_escapes_tell_bytes_apart():
    raw = "Zü".encode() + b"\xe9\xff"
    text = raw.decode("utf-8", "surrogateescape")
    assert escaped(text) == r"Zü\xe9\xff"
    assert readable(text, "latin-1") == raw.decode("latin-1")


def test_tags_may_be_written_in_any_way():
    assert {legacy_codec([tag]) for tag in ("ru", "RU", "ru_RU", "ru-Cyrl")} == {"cp1251"}
    assert legacy_codec([]) == legacy_codec(["", "xx", "ru"]) == "cp1252"
