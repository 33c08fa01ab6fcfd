"""Reading what is not UTF-8: which code a file was most likely saved in."""

from __future__ import annotations

from collections.abc import Iterable
from typing import BinaryIO

_WESTERN = "cp1252"
_CODES = {
    "cp1250": ("cs", "hr", "hu", "pl", "ro", "sk", "sl"),
    "cp1251": ("be", "bg", "kk", "ky", "mk", "ru", "sr", "tg", "tt", "uk"),
    "cp1253": ("el",),
    "cp1254": ("az", "ku", "tr"),
    "cp1255": ("he",),
    "cp1256": ("ar", "fa"),
    "cp1257": ("et", "lt", "lv"),
    "cp1258": ("vi",),
    "cp874": ("th",),
    "cp932": ("ja",),
    "cp936": ("zh",),
    "cp949": ("ko",),
}
"""The code that a language had before Unicode, as Python's codecs. From memory of the table of
fallbacks in the HTML Standard ("Determining the character encoding"), with Windows' own code where
that has another: tables that are not UTF-8 mostly come out of a spreadsheet on Windows."""


def legacy_codec(languages: Iterable[str]) -> str:
    """Give the codec that stood for a language before Unicode; Windows-1252 for most.

    Parameters
    ----------
    languages
        BCP 47 tags, of which the first one that is not empty counts.
    """
    tag = next((tag for tag in languages if tag), "").lower().replace("_", "-")
    if tag in {"zh-hant", "zh-tw", "zh-hk"}:
        return "cp950"
    main = tag.partition("-")[0]
    return next((code for code, tags in _CODES.items() if main in tags), _WESTERN)


def is_damaged_utf8(lines: BinaryIO) -> bool:
    """Tell whether a file that is not all UTF-8 was meant to be: most lines beyond ASCII are."""
    good = bad = 0
    for line in lines:
        if not line.isascii():
            try:
                line.decode()
            except UnicodeDecodeError:
                bad += 1
            else:
                good += 1
    return good > bad


def escaped(text: str) -> str:
    r"""Write the bytes that are not UTF-8 as ``\xe9``, for messages and for ids.

    Parameters
    ----------
    text
        Decoded with such bytes as lone surrogates.
    """
    return text.encode("utf-8", "surrogateescape").decode("utf-8", "backslashreplace")


def shown(text: str) -> str:
    """Give a text with U+FFFD for bytes that are not UTF-8."""
    if text.isascii():
        return text
    return text.encode("utf-8", "surrogateescape").decode("utf-8", "replace")


def readable(text: str, codec: str) -> str | None:
    """Read text that has bytes that are not UTF-8 in another code; None if it is not in that."""
    try:
        return text.encode("utf-8", "surrogateescape").decode(codec)
    except UnicodeDecodeError:
        return None
