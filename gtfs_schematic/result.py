"""What a run gave, and the files that it is written as."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from gtfs_schematic.background.model import Background
from gtfs_schematic.bundles.model import BundledLayout
from gtfs_schematic.config import Settings
from gtfs_schematic.drawing.listing import to_text
from gtfs_schematic.drawing.marks import Marks
from gtfs_schematic.drawing.model import Drawing
from gtfs_schematic.drawing.pdf import to_pdf
from gtfs_schematic.drawing.png import to_png
from gtfs_schematic.drawing.svg import to_svg
from gtfs_schematic.drift.limits import Limit, judge, limits_of
from gtfs_schematic.drift.model import DriftReport
from gtfs_schematic.drift.page import to_html
from gtfs_schematic.drift.report import to_csv
from gtfs_schematic.drift.report import to_json as drift_to_json
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.edition.save import to_json as edition_to_json
from gtfs_schematic.feed.model import Finding, Timetable
from gtfs_schematic.labels.model import LabelledLayout
from gtfs_schematic.layout.model import Layout
from gtfs_schematic.network.model import Network


@dataclass(frozen=True, slots=True)
class Result:
    """What every stage of a run gave."""

    settings: Settings
    timetable: Timetable
    network: Network
    layout: Layout
    bundled: BundledLayout
    labelled: LabelledLayout
    drawing: Drawing
    edition: Edition
    drift: DriftReport
    unmet: tuple[Finding, ...] = ()
    """Wishes of a person that the drawing does not meet."""
    state: bytes = b""
    """What redrawing without the feed needs, as it is written."""
    background: Background = field(default_factory=Background)
    marks: Marks = field(default_factory=Marks)
    """What a revision marked on the sheet."""
    """What lies beneath the network."""


def files_of(result: Result, limits: Sequence[Limit] | None = None) -> dict[str, bytes]:
    """Give the files of an edition by name: the same result always gives the same bytes.

    Parameters
    ----------
    result
        What was drawn.
    limits
        Limits on drift, None for those of the settings; what became of them stands in the
        drift report.
    """
    svg = to_svg(result.drawing)
    if limits is None:
        limits = limits_of(result.settings.drift)
    judged = judge(result.drift, limits)
    dpi = result.settings.sheet.png_dpi
    image = {"diagram.png": to_png(result.drawing, dpi=dpi)} if dpi else {}
    state = {"state.json": result.state} if result.state else {}
    return (
        image
        | state
        | {
            "diagram.svg": svg,
            "diagram.pdf": to_pdf(result.drawing, bleed_mm=result.settings.sheet.bleed_mm),
            "diagram.txt": to_text(result.network, result.settings.drawing),
            "edition.json": edition_to_json(result.edition),
            "drift.json": drift_to_json(result.drift, judged),
            "drift.csv": to_csv(result.drift),
            "drift.html": to_html(
                result.drift, result.edition, title=result.edition.title, limits=judged
            ),
        }
    )
