"""Learn from a feed which endings of its stop names tell platforms, stands and directions apart."""

from __future__ import annotations

import itertools
import re
import unicodedata
from collections import defaultdict
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field

from gtfs_schematic.geometry import Point, distance

Ending = tuple[str, ...]
"""Last words of a name in lower case; numbers and single letters stand for all their like."""
Pair = tuple[Ending, Ending]
"""Two endings in sorted order; one of them may be empty."""

_LONGEST = 3
"""Words in an ending: "platform 2 northbound"; longer ones are names of their own."""
_BASES = 3
"""So many names must be told apart by the same pair of endings: two may be chance."""
_AGREE = 0.9
"""Share of the near pairs that must not be called at one after the other."""
_PARTNERED = 0.5
"""Share of the stops with such an ending that must have their counterpart near."""
_CROWD = 30
"""A name with more endings than this, such as a long street's, teaches nothing."""

_WORD = re.compile(r"[^\W_]+")
_CLOSING = re.compile(r"[)\]}]*")
_CODE = re.compile(r"([^\W\d_]{0,2})(\d+)([^\W\d_]?)")


@dataclass(frozen=True)
class Called:
    """A stop's name with what tells whether two of them are one place."""

    id: str
    name: str
    at: Point
    """Local metres."""
    lines: frozenset[str]


@dataclass(frozen=True)
class Endings:
    """The pairs of endings that a feed uses for the parts of one station."""

    learned: frozenset[Pair] = frozenset()

    def alike(self, one: str, other: str) -> bool:
        """Tell whether two names differ by a learned pair of endings alone."""
        return _difference(one, other)[0] in self.learned

    def numbered(self, one: str, other: str) -> bool:
        """Tell whether what two names differ in are numbers or letters, as of platforms."""
        pair, _ = _difference(one, other)
        return pair is not None and all("#" in word or word == "@" for e in pair for word in e[-1:])


def shared_name(names: Sequence[str]) -> str:
    """Give what all names begin with, whole words only, as the first one writes it; "" if none."""
    shared = names[0]
    for other in names[1:]:
        shared = _difference(shared, other, longest=100)[1]
    return shared


def learned_endings(
    stops: Iterable[Called], follows: Callable[[str, str], bool], near_m: float
) -> Endings:
    """Learn endings from stops that stand close together under nearly the same name.

    A pair of endings counts as telling parts of one station apart if (1) at least three names
    take both, within `near_m` of each other; (2) hardly any trip calls at one and then at the
    other; (3) most stops with such an ending have their counterpart near. Words must also have
    lines in common; numbers and letters need not, since stands serve different lines.

    Parameters
    ----------
    stops
        All stops that are called at.
    follows
        Whether some trip calls at one stop right after the other, given two ids.
    near_m
        Greatest distance of two parts of a station, metres.
    """
    evidence: dict[Pair, _Evidence] = defaultdict(_Evidence)
    for base, group in sorted(_by_base(stops).items()):
        if not 1 < len(group) <= _CROWD:
            continue
        for (one, a), (other, b) in itertools.combinations(group, 2):
            if one[:1] == other[:1]:
                continue  # a longer beginning is common to both
            pair = _pair(one, other)
            numbers = all("#" in word or word == "@" for e in pair for word in e[-1:])
            if not numbers and a.lines.isdisjoint(b.lines):
                continue
            near = distance(a.at, b.at) <= near_m
            evidence[pair].add(base, (a.id, b.id), near=near, follows=near and follows(a.id, b.id))
    return Endings(frozenset(pair for pair, seen in evidence.items() if seen.convinces))


@dataclass
class _Evidence:
    bases: set[Ending] = field(default_factory=set)
    apart: int = 0
    in_a_row: int = 0
    partnered: set[str] = field(default_factory=set)
    involved: set[str] = field(default_factory=set)

    def add(self, base: Ending, ids: tuple[str, str], *, near: bool, follows: bool) -> None:
        self.involved.update(ids)
        if follows:
            self.in_a_row += 1
        elif near:
            self.apart += 1
            self.bases.add(base)
            self.partnered.update(ids)

    @property
    def convinces(self) -> bool:
        """Rules 1 to 3."""
        return (
            len(self.bases) >= _BASES
            and self.apart >= _AGREE * (self.apart + self.in_a_row)
            and len(self.partnered) >= _PARTNERED * len(self.involved)
        )


def _by_base(stops: Iterable[Called]) -> Mapping[Ending, list[tuple[Ending, Called]]]:
    """Per beginning of a name the stops that have it, each with its ending."""
    found: dict[Ending, list[tuple[Ending, Called]]] = defaultdict(list)
    for stop in sorted(stops, key=lambda s: s.id):
        words = [_folded(match.group()) for match in _WORD.finditer(stop.name)]
        for length in range(min(_LONGEST, len(words) - 1) + 1):
            cut = len(words) - length
            if _is_name(words[:cut]):
                found[tuple(words[:cut])].append((tuple(words[cut:]), stop))
    return found


def _difference(one: str, other: str, *, longest: int = _LONGEST) -> tuple[Pair | None, str]:
    """Give the endings of two names behind their common words, and those words.

    No pair if the names agree, or have no name in common, or too long endings.
    """
    a, b = list(_WORD.finditer(one)), list(_WORD.finditer(other))
    words, others = [_folded(m.group()) for m in a], [_folded(m.group()) for m in b]
    n = 0
    while n < min(len(a), len(b)) and words[n] == others[n]:
        n += 1
    if not _is_name(words[:n]):
        return None, ""
    end = a[n - 1].end()
    common = one[: end + len(_CLOSING.match(one, end).group())]  # type: ignore[union-attr]
    tails = words[n:], others[n:]
    if not any(tails) or max(map(len, tails)) > longest:
        return None, common if not any(tails) else ""
    return _pair(*tails), common


def _pair(one: Sequence[str], other: Sequence[str]) -> Pair:
    first, second = sorted(tuple(_shape(word) for word in words) for words in (one, other))
    return first, second


def _is_name(words: Sequence[str]) -> bool:
    """Whether something that can be read is left: not only numbers and letters."""
    return any(len(word) > 1 and not any(c.isdigit() for c in word) for word in words)


def _folded(word: str) -> str:
    return unicodedata.normalize("NFKC", word).casefold()


def _shape(word: str) -> str:
    """Let "#" stand for a number and "@" for a letter, so that "C12" is like "D7"."""
    if len(word) == 1 and word.isalpha():
        return "@"
    code = _CODE.fullmatch(word)
    if code is None:
        return word
    return "@" * bool(code[1]) + "#" + "@" * bool(code[3])
