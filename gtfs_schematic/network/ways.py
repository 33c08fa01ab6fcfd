"""Which modes may share a way on the ground."""

from __future__ import annotations

from collections.abc import Mapping

WAYS: Mapping[str, str] = {
    "tram": "street",
    "bus": "street",
    "trolleybus": "street",
    "cable": "street",
}
"""Modes that may share a way; every other mode has one of its own."""


def way_of_mode(mode: str) -> str:
    """Give the kind of way that a mode runs on."""
    return WAYS.get(mode, mode)
