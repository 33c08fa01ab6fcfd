"""A fingerprint of a feed's content that does not hang on how the feed was packed."""

from __future__ import annotations

import codecs
import hashlib
from dataclasses import dataclass

from gtfs_schematic.feed.archive import FeedFiles

_WIDTH = 32
_MODULUS = 1 << (8 * _WIDTH)


@dataclass(frozen=True)
class Fingerprint:
    """What one pass over all bytes of a feed tells."""

    sha256: str
    not_utf8: frozenset[str]
    """Names of the files that are not valid UTF-8."""


def fingerprint(files: FeedFiles) -> Fingerprint:
    """Hash the content of all text files of a feed, and find those that are not UTF-8.

    The hash is SHA-256 over, for every ``.txt`` and ``.geojson`` file in order of name: the
    name, the first line, the number of lines, and the sum modulo 2^256 of the SHA-256 of every
    other line. Byte order marks, line ends and blank lines do not count. So neither the packing
    (time stamps, compression, order of files, nested folder) nor the order of rows matters, but
    every changed, added, doubled or lost row does. A sum of hashes is the additive multiset hash
    of Clarke, Devadas, van Dijk, Gassend & Suh (2003, "Incremental multiset hash functions",
    ASIACRYPT); it tells editions apart and is no protection against forgery.
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
    total = count = 0
    header = b""
    valid = True
    sha256, number = hashlib.sha256, int.from_bytes
    with files.open(name) as lines:
        for line in lines:
            if not line.isascii() and valid:
                valid = _is_utf8(line)
            text = line.rstrip(b"\r\n")
            if count == 0:
                header = text = text.removeprefix(codecs.BOM_UTF8)
            elif text:
                total += number(sha256(text).digest())
            if text:
                count += 1
    parts = (sha256(header).digest(), count.to_bytes(8), (total % _MODULUS).to_bytes(_WIDTH))
    return b"".join(parts), valid


def _is_utf8(line: bytes) -> bool:
    try:
        line.decode()
    except UnicodeDecodeError:
        return False
    return True
