"""A fingerprint of a feed's content that does not hang on how the feed was packed."""

from __future__ import annotations

import codecs
import hashlib
from dataclasses import dataclass

import numpy as np

from gtfs_schematic.feed import kernels
from gtfs_schematic.feed.archive import FeedFiles
from gtfs_schematic.feed.blocks import whole_lines

_MODULUS = 1 << 64


@dataclass(frozen=True)
class Fingerprint:
    """What one pass over all bytes of a feed tells."""

    sha256: str
    not_utf8: frozenset[str]
    """Names of the files that are not valid UTF-8."""


def fingerprint(files: FeedFiles) -> Fingerprint:
    """Hash the content of all text files of a feed, and find those that are not UTF-8.

    The hash is SHA-256 over, for every ``.txt`` and ``.geojson`` file in order of name: the
    name, the first line, the number of lines, and two sums modulo 2^64 of 64-bit hashes of all
    lines (`kernels.murmur`, with two seeds). Byte order marks, line ends and blank lines do not
    count. So neither the packing (time stamps, compression, order of files, nested folder) nor
    the order of rows matters, but every changed, added, doubled or lost row does. A sum of hashes
    is the additive multiset hash of Clarke, Devadas, van Dijk, Gassend & Suh (2003, "Incremental
    multiset hash functions", ASIACRYPT); with hashes of this kind it tells editions apart and is
    no protection against forgery.
    """
    whole = hashlib.sha256()
    bad = set()
    for name in files.names:
        if not name.endswith((".txt", ".geojson")):
            continue
        summary, valid = _file_summary(files, name)
        whole.update(name.encode("utf-8", "surrogateescape") + b"\0" + summary)
        if not valid:
            bad.add(name)
    return Fingerprint(whole.hexdigest(), frozenset(bad))


def joint_sha256(parts: list[str]) -> str:
    """Give the fingerprint of several feeds read as one, in the order given."""
    if len(parts) == 1:
        return parts[0]
    return hashlib.sha256("\n".join(parts).encode()).hexdigest()


def _file_summary(files: FeedFiles, name: str) -> tuple[bytes, bool]:
    """Give what stands for one file in the hash, and whether the file is UTF-8."""
    first = second = count = 0
    header = b""
    valid = True
    with files.open(name) as stream:
        for number, piece in enumerate(whole_lines(stream)):
            valid = valid and (piece.isascii() or _is_utf8(piece))
            start = 0
            if number == 0:
                start = len(codecs.BOM_UTF8) if piece.startswith(codecs.BOM_UTF8) else 0
                header = piece[start:].lstrip(b"\r\n").split(b"\n", 1)[0].rstrip(b"\r")
            lines = np.frombuffer(piece, dtype=np.uint8)
            one, two, more = kernels.hash_lines(lines, start, len(piece))
            first, second, count = first + int(one), second + int(two), count + more
    sums = (total % _MODULUS for total in (first, second, count))
    return hashlib.sha256(header).digest() + b"".join(s.to_bytes(8) for s in sums), valid


def _is_utf8(lines: bytes) -> bool:
    try:
        lines.decode()
    except UnicodeDecodeError:
        return False
    return True
