"""Transit network diagrams from GTFS feeds: drawn, measured, and kept up to date.

Each stage is a verb that takes one frozen value and gives the next, so that a notebook can run any
of them alone; `draw` runs them all, each followed by its own check. Names are loaded when first
used, so that importing the package is quick.
"""

from __future__ import annotations

import importlib
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from gtfs_schematic.bundles.build import bundle
    from gtfs_schematic.bundles.model import BundledLayout
    from gtfs_schematic.config import Settings, settings_from_toml
    from gtfs_schematic.demo.write import write_demo
    from gtfs_schematic.drawing.compose import compose
    from gtfs_schematic.drawing.model import Drawing
    from gtfs_schematic.drawing.pdf import to_pdf
    from gtfs_schematic.drawing.png import to_png
    from gtfs_schematic.drawing.sheet import candidate_frames
    from gtfs_schematic.drawing.svg import to_svg
    from gtfs_schematic.drift.measure import measure_edition
    from gtfs_schematic.drift.model import DriftReport
    from gtfs_schematic.edition.folder import load_edition, write_folder
    from gtfs_schematic.edition.make import edition_of
    from gtfs_schematic.edition.model import Edition
    from gtfs_schematic.errors import SchematicError
    from gtfs_schematic.feed.model import Timetable
    from gtfs_schematic.feed.read import read_feed
    from gtfs_schematic.labels.model import LabelledLayout
    from gtfs_schematic.labels.place import place_labels
    from gtfs_schematic.labels.room import name_rooms
    from gtfs_schematic.layout.engine import lay_out
    from gtfs_schematic.layout.model import Layout
    from gtfs_schematic.network.build import build_network
    from gtfs_schematic.network.export import to_geojson
    from gtfs_schematic.network.model import Network
    from gtfs_schematic.pipeline import Result, clearances_of, draw, files_of, inspect

__all__ = [
    "BundledLayout",
    "Drawing",
    "DriftReport",
    "Edition",
    "LabelledLayout",
    "Layout",
    "Network",
    "Result",
    "SchematicError",
    "Settings",
    "Timetable",
    "build_network",
    "bundle",
    "candidate_frames",
    "clearances_of",
    "compose",
    "draw",
    "edition_of",
    "files_of",
    "inspect",
    "lay_out",
    "load_edition",
    "measure_edition",
    "name_rooms",
    "place_labels",
    "read_feed",
    "settings_from_toml",
    "to_geojson",
    "to_pdf",
    "to_png",
    "to_svg",
    "write_demo",
    "write_folder",
]

_HOMES = {
    "bundles.build": ("bundle",),
    "bundles.model": ("BundledLayout",),
    "config": ("Settings", "settings_from_toml"),
    "demo.write": ("write_demo",),
    "drawing.compose": ("compose",),
    "drawing.model": ("Drawing",),
    "drawing.pdf": ("to_pdf",),
    "drawing.png": ("to_png",),
    "drawing.sheet": ("candidate_frames",),
    "drawing.svg": ("to_svg",),
    "drift.measure": ("measure_edition",),
    "drift.model": ("DriftReport",),
    "edition.folder": ("load_edition", "write_folder"),
    "edition.make": ("edition_of",),
    "edition.model": ("Edition",),
    "errors": ("SchematicError",),
    "feed.model": ("Timetable",),
    "feed.read": ("read_feed",),
    "labels.model": ("LabelledLayout",),
    "labels.place": ("place_labels",),
    "labels.room": ("name_rooms",),
    "layout.engine": ("lay_out",),
    "layout.model": ("Layout",),
    "network.build": ("build_network",),
    "network.export": ("to_geojson",),
    "network.model": ("Network",),
    "pipeline": ("Result", "clearances_of", "draw", "files_of", "inspect"),
}
"""Which module each public name lives in."""

_HOME = {name: module for module, names in _HOMES.items() for name in names}


def __getattr__(name: str) -> object:
    """Load a public name when it is first used."""
    if name not in _HOME:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    value: object = getattr(importlib.import_module(f"{__name__}.{_HOME[name]}"), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    """List the public names."""
    return sorted(__all__)
