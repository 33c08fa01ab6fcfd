"""A fingerprint of a feed's content that does not hang on how the feed was packed."""

from __future__ import annotations

import codecs
import hashlib
from concurrent.futures import Executor
from dataclasses import dataclass

from gtfs_schematic.feed import kernels
from gtfs_schematic.feed.archive import FeedFiles
from gtfs_schematic.feed.blocks import whole_lines

_MODULUS = 1 << 64
_ASCII = 128
_LARGE = {"stop_times.txt", "shapes.txt"}


class Digest:
    """What a pass over all bytes of a feed tells, made beside the reading of its tables.

    `sha256` is over, for every ``.txt`` and ``.geojson`` file in order of name: the name, the
    first line, the number of lines, and two sums modulo 2^64 of 64-bit hashes of all lines
    (`kernels.murmur`, with two seeds). Byte order marks, line ends and blank lines do not count.
    So neither the packing (time stamps, compression, order of files, nested folder) nor the order
    of rows matters, but every changed, added, doubled or lost row does. A sum of hashes is the
    additive multiset hash of Clarke, Devadas, van Dijk, Gassend & Suh (2003, "Incremental multiset
    hash functions", ASIACRYPT); with hashes of this kind it tells editions apart and is no
    protection against forgery.

    Parameters
    ----------
    files
        Of the feed.
    pool
        Works on the files one after the other, the small ones first.
    """

    def __init__(self, files: FeedFiles, pool: Executor) -> None:
        names = [name for name in files.names if name.endswith((".txt", ".geojson"))]
        ordered = sorted(names, key=lambda name: (name in _LARGE, name))
        self._summaries = {name: pool.submit(_summary, files, name) for name in ordered}

    def is_utf8(self, name: str) -> bool:
        """Tell whether a file is UTF-8 throughout; waits until that is known."""
        return name not in self._summaries or self._summaries[name].result().is_utf8

    @property
    def sha256(self) -> str:
        """The fingerprint of the content; waits for all files."""
        whole = hashlib.sha256()
        for name, summary in sorted(self._summaries.items()):
            whole.update(name.encode("utf-8", "surrogateescape") + b"\0" + summary.result().sums)
        return whole.hexdigest()


def joint_sha256(parts: list[str]) -> str:
    """Give the fingerprint of several feeds read as one, in the order given."""
    if len(parts) == 1:
        return parts[0]
    return hashlib.sha256("\n".join(parts).encode()).hexdigest()


@dataclass(frozen=True)
class _Summary:
    sums: bytes
    """What stands for a file in the hash."""
    is_utf8: bool


def _summary(files: FeedFiles, name: str) -> _Summary:
    first = second = count = 0
    header = b""
    valid = True
    with files.open(name) as stream:
        for number, piece in enumerate(whole_lines(stream, name)):
            valid = valid and (piece.max() < _ASCII or _is_utf8(piece.tobytes()))
            start = 0
            if number == 0:
                text = piece.tobytes()
                start = len(codecs.BOM_UTF8) if text.startswith(codecs.BOM_UTF8) else 0
                header = text[start:].lstrip(b"\r\n").split(b"\n", 1)[0].rstrip(b"\r")
            one, two, more = kernels.hash_lines(piece, start)
            first, second, count = first + int(one), second + int(two), count + more
    sums = (total % _MODULUS for total in (first, second, count))
    told = hashlib.sha256(header).digest() + b"".join(total.to_bytes(8) for total in sums)
    return _Summary(told, valid)


def _is_utf8(lines: bytes) -> bool:
    try:
        lines.decode()
    except UnicodeDecodeError:
        return False
    return True
