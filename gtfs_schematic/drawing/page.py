"""The plan of a page: title above, notes below, key beside or below, the network in the rest."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from gtfs_schematic.drawing.key import Key, key_below, key_beside
from gtfs_schematic.drawing.model import DrawingSettings
from gtfs_schematic.drawing.register import Register, register_of
from gtfs_schematic.drawing.style import LEADING, TypeScale, type_scale
from gtfs_schematic.drawing.words import notes, sheet_title, subtitle, wrap
from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.model import SheetFrame
from gtfs_schematic.network.model import Network

Place = Literal["beside", "below"]
_NOTE_WIDTH = 42.0
"""Widest column of notes, in type sizes: some 85 letters, the most that reads well (common
practice, no source)."""
_NOTE_GAP = 3.0


@dataclass(frozen=True, slots=True)
class TextBlock:
    """Wrapped text: its lines, and where the baseline of the first begins, millimetres."""

    lines: tuple[str, ...]
    at: Point


@dataclass(frozen=True, slots=True)
class Page:
    """Where everything but the network stands; millimetres, y down."""

    frame: SheetFrame
    type: TypeScale
    title: TextBlock
    subtitle: TextBlock
    key: Key
    key_at: Point
    notes: tuple[TextBlock, ...]
    rule_y: float
    """Height of the hairline above the notes."""
    register: Register | None = None
    register_at: Point = (0.0, 0.0)


def plan_page(
    network: Network,
    settings: DrawingSettings,
    size_mm: tuple[float, float],
    margin_mm: float,
    place: Place,
) -> Page:
    """Plan a page of `size_mm` (width, height) with the key at `place`.

    The frame of the plan may be small or even turned inside out where the sheet is too small for
    its key: the caller judges.
    """
    width, height = size_mm
    inner = width - 2.0 * margin_mm
    type_ = type_scale(width, height, settings.body_size_pt)
    title = wrap(sheet_title(network, settings), inner, type_.title, bold=True)
    under = wrap(subtitle(network), inner, type_.subtitle)
    title_y = margin_mm + 0.8 * type_.title
    under_y = title_y + (len(title) - 1) * 1.15 * type_.title + 0.85 * type_.title
    top = under_y + len(under) * LEADING * type_.subtitle + 1.2 * type_.body
    blocks, rule_y = _notes(network, settings, type_, (width, height), margin_mm)
    bottom = rule_y - 1.5 * type_.body
    gap = 2.5 * type_.body
    register = register_of(network, type_, inner) if settings.index else None
    if register:
        top += 0.6 * type_.body
        bottom -= register.height + 0.5 * gap
    register_at = (margin_mm, bottom + 0.5 * gap)
    right = width - margin_mm
    if place == "beside":
        key = key_beside(network, settings, type_, bottom - top)
        key_at = (right - key.width, top)
        right = key_at[0] - gap
    else:
        key = key_below(network, settings, type_, inner)
        key_at = (margin_mm, bottom - key.height)
        bottom = key_at[1] - gap
    return Page(
        frame=SheetFrame(width, height, margin_mm, top, right, bottom),
        type=type_,
        title=TextBlock(title, (margin_mm, title_y)),
        subtitle=TextBlock(under, (margin_mm, under_y)),
        key=key,
        key_at=key_at,
        notes=blocks,
        rule_y=rule_y,
        register=register,
        register_at=register_at,
    )


def plan_of_frame(network: Network, settings: DrawingSettings, frame: SheetFrame) -> Page:
    """Plan the page again from the frame that it once gave."""
    beside = frame.width_mm - frame.right_mm > frame.left_mm + 1e-6
    size = (frame.width_mm, frame.height_mm)
    return plan_page(network, settings, size, frame.left_mm, "beside" if beside else "below")


def _notes(
    network: Network,
    settings: DrawingSettings,
    type_: TypeScale,
    size_mm: tuple[float, float],
    margin_mm: float,
) -> tuple[tuple[TextBlock, ...], float]:
    """Set the notes in columns along the lower edge; give them and the height of their rule."""
    texts = notes(network, settings)
    inner = size_mm[0] - 2.0 * margin_mm
    gap = _NOTE_GAP * type_.body
    columns = max(1, min(len(texts), round(inner / (_NOTE_WIDTH * type_.body))))
    width = min((inner - (columns - 1) * gap) / columns, _NOTE_WIDTH * 1.4 * type_.body)
    wrapped = [wrap(text, width, type_.body) for text in texts]
    stacks: list[list[tuple[str, ...]]] = [[] for _ in range(columns)]
    for lines in wrapped:
        min(stacks, key=lambda stack: sum(len(part) for part in stack)).append(lines)
    most = max(sum(len(part) for part in stack) for stack in stacks)
    last_y = size_mm[1] - margin_mm - 0.25 * type_.body
    first_y = last_y - (most - 1) * LEADING * type_.body
    blocks = []
    for i, stack in enumerate(stacks):
        y = first_y
        for lines in stack:
            blocks.append(TextBlock(lines, (margin_mm + i * (width + gap), y)))
            y += len(lines) * LEADING * type_.body
    return tuple(blocks), first_y - 1.6 * type_.body
