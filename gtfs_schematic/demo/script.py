"""Second names: the invented names spelled in Greek letters."""

# ruff: noqa: RUF001 - Greek letters that look like Latin ones are meant.
from __future__ import annotations

import re

LANGUAGE = "qaa-Latn"
SECOND_LANGUAGE = "qaa-Grek"
"""BCP 47: the code qaa is set aside for private use (ISO 639-2), as befits an invented language."""

_SOUNDS = {
    "qu": "κου", "th": "θ", "kh": "χ", "sh": "σ", "a": "α", "å": "ά", "á": "ά", "b": "μπ",
    "c": "κ", "d": "δ", "e": "ε", "é": "έ", "ě": "έ", "f": "φ", "g": "γ", "h": "χ", "i": "ι",
    "í": "ί", "j": "γι", "k": "κ", "l": "λ", "m": "μ", "n": "ν", "o": "ο", "ó": "ώ", "ő": "ώ",
    "p": "π", "r": "ρ", "ř": "ρζ", "s": "σ", "š": "σ", "t": "τ", "u": "ου", "ú": "ού",
    "ů": "ού", "v": "β", "w": "ου", "x": "ξ", "y": "υ", "z": "ζ", "ž": "ζ",
}  # fmt: skip
_SOUND = re.compile("|".join(sorted(_SOUNDS, key=lambda sound: (-len(sound), sound))))
_PLAIN = str.maketrans("άέίύώ", "αειυω")
_WORD = re.compile(r"[^\W\d_]+")


def _word(match: re.Match[str]) -> str:
    word = match.group()
    greek = _SOUND.sub(lambda sound: _SOUNDS[sound.group()], word.lower())
    stressed = max(greek.rfind(letter) for letter in "άέίύώ")
    if stressed > 0:  # one accent in a word: the last
        greek = greek[:stressed].translate(_PLAIN) + greek[stressed:]
    if greek.endswith("σ"):
        greek = greek[:-1] + "ς"
    return greek.capitalize() if word[0].isupper() else greek


def second_name(name: str) -> str:
    """Give a name in Greek letters; digits and punctuation stay."""
    return _WORD.sub(_word, name)
