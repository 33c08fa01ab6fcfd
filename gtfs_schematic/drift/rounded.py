"""Round what was measured: the last digits of a number are the processor's, not the drawing's."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import fields, is_dataclass, replace
from typing import Any, TypeVar, cast

_DIGITS = 9
"""Decimals that are kept: as many as any file shows, and some."""
_T = TypeVar("_T")


def rounded(value: _T) -> _T:
    """Round every number in a value: in tuples, mappings and dataclasses, however deep."""
    found: Any = value
    if isinstance(value, float):
        found = round(value, _DIGITS)
    elif isinstance(value, tuple):
        found = tuple(map(rounded, value))
    elif isinstance(value, Mapping):
        found = {key: rounded(each) for key, each in value.items()}
    elif is_dataclass(value) and not isinstance(value, type):
        found = replace(value, **{f.name: rounded(getattr(value, f.name)) for f in fields(value)})
    return cast("_T", found)
