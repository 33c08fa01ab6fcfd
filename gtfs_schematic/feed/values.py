"""The values of GTFS fields: times, dates, coordinates, colours, whole numbers and names.

Every ``parse_*`` function takes the text of a field, already stripped and not empty, and raises
ValueError if it does not follow the GTFS Schedule reference, section "Field Types".
"""

from __future__ import annotations

import datetime as dt
import re
import unicodedata

LONGEST_NAME = 250
"""What is longer is no name that a sheet could hold; the rest is cut off."""

_TIME = re.compile(r"(\d{1,3}):([0-5]\d):([0-5]\d)", re.ASCII)
_DATE = re.compile(r"(\d{4})(\d{2})(\d{2})", re.ASCII)
_COLOR = re.compile(r"[0-9A-Fa-f]{6}", re.ASCII)
_WHOLE = re.compile(r"[+-]?\d{1,15}", re.ASCII)
_DECIMAL = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d{1,3})?", re.ASCII)


def parse_time(text: str) -> int:
    """Give the seconds after noon minus 12 h of "H:MM:SS" or "HH:MM:SS"; hours may pass 24."""
    match = _TIME.fullmatch(text)
    if match is None:
        raise ValueError(text)
    hours, minutes, seconds = map(int, match.groups())
    return 3600 * hours + 60 * minutes + seconds


def parse_date(text: str) -> dt.date:
    """Give the date of "YYYYMMDD"."""
    match = _DATE.fullmatch(text)
    if match is None:
        raise ValueError(text)
    year, month, day = map(int, match.groups())
    return dt.date(year, month, day)


def parse_color(text: str) -> str:
    """Give "#RRGGBB" of six hexadecimal digits."""
    if _COLOR.fullmatch(text) is None:
        raise ValueError(text)
    return f"#{text.upper()}"


def parse_whole(text: str) -> int:
    """Give the whole number that `text` writes in decimal digits."""
    if _WHOLE.fullmatch(text) is None:
        raise ValueError(text)
    return int(text)


def parse_degrees(text: str, limit: float) -> float:
    """Give a latitude (`limit` 90) or longitude (`limit` 180) in degrees."""
    if _DECIMAL.fullmatch(text) is None:
        raise ValueError(text)
    degrees = float(text)
    if abs(degrees) > limit:  # infinity, as 1e999 is, as well
        raise ValueError(text)
    return degrees


def is_nowhere(lon: float, lat: float) -> bool:
    """Tell whether a place is one that only missing data names: near 0° N 0° E, or at a pole.

    The square of two degrees round the origin is open sea, so no stop on land is lost.
    """
    return (abs(lon) < 1.0 and abs(lat) < 1.0) or abs(lat) > 89.0


def is_clean(text: str) -> bool:
    """Tell whether `clean_name` would certainly leave a stripped text as it is."""
    return len(text) <= LONGEST_NAME and text.isprintable() and "  " not in text


def clean_name(text: str) -> str:
    """Give `text` with white space as single spaces, no control characters, and not too long.

    The reference forbids tabs and line ends in values; control characters are not even allowed
    in an XML file. Characters that shape text (zero-width joiners, direction marks) stay.
    """
    if is_clean(text):
        return text.strip()
    spaced = (" " if char.isspace() else char for char in text)
    clean = " ".join("".join(char for char in spaced if not _is_control(char)).split())
    return clean if len(clean) <= LONGEST_NAME else clean[: LONGEST_NAME - 1].rstrip() + "…"


def _is_control(char: str) -> bool:
    return unicodedata.category(char) in {"Cc", "Cs"} or char in "\ufffe\uffff"


def has_controls(text: str) -> bool:
    """Tell whether a text holds characters that no XML file may hold."""
    return not text.isprintable() and any(map(_is_control, text))
