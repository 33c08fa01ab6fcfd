"""Compiled loops agree with plain Python, and the hash with its published check value."""

from __future__ import annotations

import csv
import io

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.feed import kernels, numerals
from gtfs_schematic.feed.interned import UNKNOWN, Interned
from gtfs_schematic.feed.values import parse_degrees, parse_time, parse_whole

TEXTS = st.text(st.characters(codec="utf-8"), max_size=24)
NUMERALS = st.text("0123456789+-.:e ", max_size=17) | st.sampled_from(
    ["", "08:00:00", "8:5:00", "999:59:59", "1000:00:00", "08:60:00", "-0", "+1.5", ".5", "5."]
)


def fields(texts):
    """Give texts as a buffer, with where each starts and ends."""
    encoded = [text.encode() for text in texts]
    ends = np.cumsum([0, *map(len, encoded)], dtype=np.int32)
    return np.frombuffer(b"".join(encoded), np.uint8), ends[:-1], ends[1:]


def hashed(data, seed):
    buffer = np.frombuffer(data, np.uint8)
    return int(kernels.murmur(buffer, 0, len(data), (seed, 0))[0]).to_bytes(8, "little")


def test_the_hash_has_its_published_check_value():
    """The check of SMHasher, the test suite of the hash's author: 0x1F0D3804 for MurmurHash64A."""
    hashes = b"".join(hashed(bytes(range(n)), 256 - n) for n in range(256))
    assert hashed(hashes, 0)[:4] == (0x1F0D3804).to_bytes(4, "little")


@given(st.lists(st.sampled_from([b"", b"a,b", b"long line of some text", b"\xc3\xa9"]), max_size=6))
def test_the_hash_of_lines_is_the_sum_of_their_hashes(lines):
    data = np.frombuffer(b"\r\n".join(lines) + b"\n", np.uint8)
    first, second, count = kernels.hash_lines(data, 0)
    kept = [line for line in lines if line]
    for total, seed in ((first, 1), (second, 2)):
        expected = sum(int.from_bytes(hashed(line, seed), "little") for line in kept)
        assert int(total) == expected % 2**64
    assert count == len(kept)


@given(st.lists(TEXTS, max_size=30), st.lists(TEXTS, max_size=10))
def test_texts_are_numbered_as_a_dictionary_would(texts, others):
    known = Interned()
    numbers = known.add(fields(texts)).tolist()
    order = list(dict.fromkeys(texts))
    assert numbers == [order.index(text) for text in texts]
    assert [known[n] for n in range(len(known))] == order
    expected = [order.index(text) if text in order else UNKNOWN for text in others]
    assert known.find(fields(others)).tolist() == expected
    assert [text in known for text in others] == [text in order for text in others]


def test_many_texts_are_told_apart():
    texts = [f"trip-{n}" for n in range(50_000)]
    known = Interned(texts)
    assert len(known) == 50_000
    assert [known.find_text(text) for text in texts[::999]] == list(range(0, 50_000, 999))
    assert known.find_text("trip-50000") == UNKNOWN


def outcome(parse, text):
    try:
        return parse(text)
    except ValueError:
        return None


@given(st.lists(NUMERALS, max_size=12))
def test_numerals_are_read_as_the_strict_parsers_do(texts):
    wanted = np.ones(len(texts), np.uint8)
    for kernel, parse, kind in (
        (numerals.parse_times, parse_time, np.int64),
        (numerals.parse_wholes, parse_whole, np.int64),
        (numerals.parse_decimals, lambda text: parse_degrees(text, 1e300), np.float64),
    ):
        odd, out = np.zeros(len(texts), np.uint8), np.empty(len(texts), kind)
        kernel(fields(texts), wanted, odd, out)
        for text, strange, value in zip(texts, odd, out, strict=True):
            if not strange and not (text == "" and kernel is numerals.parse_times):
                assert value == outcome(parse, text)
        if kernel is numerals.parse_times:
            assert [bool(n) for n in odd] == [
                text != "" and outcome(parse_time, text) is None for text in texts
            ]


@given(st.decimals(-180, 180, places=7))
def test_decimals_of_feeds_are_never_odd(number):
    text = f"{number:f}"
    odd, out = np.zeros(1, np.uint8), np.empty(1)
    numerals.parse_decimals(fields([text]), np.ones(1, np.uint8), odd, out)
    assert (odd[0], out[0]) == (0, float(text))


CELLS = st.text('ab ,"\t\r\né', max_size=6)


@given(
    st.lists(st.lists(CELLS, min_size=1, max_size=4), max_size=6),
    st.sampled_from(["\n", "\r\n"]),
)
def test_lines_are_split_as_the_csv_module_does(rows, end):
    text = io.StringIO()
    csv.writer(text, lineterminator=end).writerows(rows)
    data = text.getvalue().encode()
    starts = np.empty((3, 50), np.int32)
    ends, kinds = np.empty_like(starts), np.empty(50, np.uint8)
    columns = np.array([2, -1, 0, 1])
    buffer = np.frombuffer(data, np.uint8)
    count, stop = kernels.split_lines(buffer, 0, columns, starts, ends, kinds)
    parsed = list(csv.reader(io.StringIO(text.getvalue(), newline="")))
    broken = any(char in cell for row in rows for cell in row for char in "\r\n")
    assert data[stop:] == b"" or broken
    for n in range(count):
        assert (kinds[n] == kernels.BLANK) == (parsed[n] == [])
        if kinds[n] == kernels.REGULAR:
            got = [data[starts[k, n] : ends[k, n]].decode() for k in range(3)]
            assert got == [parsed[n][k].strip(" \t") for k in (2, 3, 0)]
        else:
            assert len(parsed[n]) != 4 or any('"' in cell for cell in parsed[n])
