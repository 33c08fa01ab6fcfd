"""When two stop names mean the same place, and how names sort for a person."""

from __future__ import annotations

import re
import unicodedata

_BARE_WORDS = frozenset(
    {
        *("inbound", "outbound", "northbound", "southbound", "eastbound", "westbound"),
        *("nb", "sb", "eb", "wb", "ib", "ob", "opp", "opposite", "stop", "station"),
    }
)
"""Words that say which kerb or what kind of place is meant, not which place."""
_NUMBERED = frozenset(["bay", "gate", "platform", "pole", "stand", "stop"])
"""Words that say which part of a stop is meant together with the number or letter after them."""
_POLE_CODE = re.compile(r"[a-z]{0,2}\d{1,5}[a-z]?")


def name_key(name: str) -> str:
    """Give the name without case, accents of composition, punctuation and double spaces."""
    folded = unicodedata.normalize("NFKC", name).casefold()
    return " ".join(re.findall(r"\w+", folded))


def loose_key(name: str) -> str:
    """Give what is left of a name without directions, brackets, bays and a trailing pole code.

    Operators tell the two kerbs of a street apart in the name ("Mill Lane A12", "Mill Lane
    inbound", "Mill Lane (school)"); the order of cross streets often flips. Words come sorted.
    Empty where nothing is left.
    """
    words = name_key(re.sub(r"\([^()]*\)", " ", name)).split()
    kept: list[str] = []
    skip = False
    for i, word in enumerate(words):
        if skip:
            skip = False
        elif word in _NUMBERED and i + 1 < len(words) and len(words[i + 1]) <= 2:
            skip = True
        elif word not in _BARE_WORDS:
            kept.append(word)
    while len(kept) > 1 and any(c.isalpha() for c in kept[-1]) and _POLE_CODE.fullmatch(kept[-1]):
        kept.pop()
    return " ".join(sorted(kept))


def natural_key(text: str) -> tuple[tuple[int, int, str], ...]:
    """Give a sort key under which "9" comes before "10", and "10" before "10A"."""
    parts = re.findall(r"\d+|\D+", text)
    # Python turns no text of thousands of digits into a number.
    return tuple((0, int(p), "") if p.isdecimal() and len(p) < 19 else (1, 0, p) for p in parts)
