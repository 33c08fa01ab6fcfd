"""Title, key and notes: everything on the sheet that is not the network."""

from __future__ import annotations

from gtfs_schematic.drawing import key as keys
from gtfs_schematic.drawing.contrast import mix
from gtfs_schematic.drawing.key import Key, KeyRow
from gtfs_schematic.drawing.markers import (
    STEP_FREE_COLORS,
    MarkerLook,
    chevron,
    marker,
    step_free_sign,
    walk_shapes,
)
from gtfs_schematic.drawing.marks import closed_sign
from gtfs_schematic.drawing.model import DrawingSettings, Group, PathShape, TextShape
from gtfs_schematic.drawing.page import Page, TextBlock
from gtfs_schematic.drawing.paths import polyline
from gtfs_schematic.drawing.style import (
    LEADING,
    WALK_WIDTH_MM,
    LineStyle,
    badge_tile,
    line_stroke,
    line_styles,
    quiet,
    service_style,
    under_strokes,
)
from gtfs_schematic.drawing.words import run
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels import fonts
from gtfs_schematic.network.model import Network, StationKind

_ON_A_LINE: dict[str, StationKind] = {"stop": "stop", "interchange": "interchange"}
"""Signs that stand in the middle of a piece of line."""
_SAMPLE_WIDTH = 0.5
"""Width of a piece of line in the key, in type sizes."""


def title_group(page: Page, settings: DrawingSettings) -> Group:
    """Give the title, and below it dates, publisher and version."""
    title = _block(page.title, page.type.title, settings.ink, bold=True, leading=1.15)
    under = _block(page.subtitle, page.type.subtitle, quiet(settings), bold=False)
    return Group("title-block", (Group("sheet-title", title), Group("sheet-subtitle", under)))


def notes_group(page: Page, settings: DrawingSettings) -> Group:
    """Give cautions and attribution under a hairline."""
    frame = page.frame
    rule = PathShape(
        polyline([(frame.left_mm, page.rule_y), (frame.width_mm - frame.left_mm, page.rule_y)]),
        stroke=mix(settings.ink, settings.background, 0.6),
        stroke_width=0.2,
        cap="butt",
    )
    blocks = tuple(
        Group("note", _block(block, page.type.body, quiet(settings), bold=False))
        for block in page.notes
    )
    return Group("notes", (rule, *blocks))


def key_group(page: Page, network: Network, settings: DrawingSettings, look: MarkerLook) -> Group:
    """Give the key."""
    artist = _KeyArtist(page, network, settings, look)
    return Group("key", tuple(artist.row(placed) for placed in page.key.rows), title="Key")


class _KeyArtist:
    """Draws the rows of one key."""

    def __init__(
        self, page: Page, network: Network, settings: DrawingSettings, look: MarkerLook
    ) -> None:
        self.key: Key = page.key
        self.type = page.type
        self.corner = page.key_at
        self.network = network
        self.settings = settings
        self.look = look
        self.styles = line_styles(network, settings)
        self.plain = LineStyle(
            color=mix(settings.ink, settings.background, 0.45),
            width=1.0,
            dash=(),
            beads=False,
            under=mix(settings.ink, settings.background, 0.8),
            edge="",
        )

    def row(self, placed: keys.PlacedRow) -> Group:
        """Draw one row."""
        x, y = self.corner[0] + placed.x, self.corner[1] + placed.y
        row = placed.row
        body = self.type.body
        if row.kind == "heading":
            text = run(row.bold_text[0], (x, y + body), body * 1.1, self.settings.ink, bold=True)
            return Group("key-heading", (text,))
        middle = y + 0.5 * keys.badge_height(self.type)
        start = x + keys.sample_offset(self.key, self.type)
        if row.kind == "sign":
            start = x
        end = x + keys.sample_offset(self.key, self.type) + keys.sample_length(self.type)
        piece = ((start, middle), (end, middle))
        shapes: tuple[PathShape | TextShape, ...]
        if row.kind == "line":
            shapes = (*self._stroke(piece, self.styles[row.id]), *self._badge(row, (x, y)))
        else:
            shapes = self._sign(row.id, piece)
        words = self._words(row, (x + keys.text_offset(self.key, self.type), middle))
        data = {"for-line": row.id} if row.kind == "line" else {}
        return Group("key-row", (*shapes, *words), data=data)

    def _stroke(self, piece: tuple[Point, Point], style: LineStyle) -> tuple[PathShape, ...]:
        d, width = polyline(piece), _SAMPLE_WIDTH * self.type.body
        return (*under_strokes(d, style, width), line_stroke(d, style, width))

    def _badge(self, row: KeyRow, corner: Point) -> tuple[PathShape | TextShape, ...]:
        if not row.name:
            return ()
        line, body = self.network.line[row.id], self.type.body
        x, y = corner
        width, height = self.key.badge_width, keys.badge_height(self.type)
        tile = badge_tile((x, y, x + width, y + height), self.styles[row.id])
        text_x = x + (width - keys.badge_text_width(row.name, self.type)) / 2.0
        base = y + (height + fonts.metrics(bold=True).cap_height * body) / 2.0
        return (tile, run(row.name, (text_x, base), body, line.text_color, bold=True))

    def _words(self, row: KeyRow, at: Point) -> tuple[TextShape, ...]:
        body, ink = self.type.body, self.settings.ink
        base = at[1] + fonts.metrics().cap_height * body / 2.0
        texts = [(text, True) for text in row.bold_text] + [(text, False) for text in row.text]
        return tuple(
            run(text, (at[0], base + i * LEADING * body), body, ink, bold=bold)
            for i, (text, bold) in enumerate(texts)
        )

    def _alone(self, sign: str, middle: Point) -> tuple[PathShape, ...]:
        """Draw a sign that stands on no line."""
        if sign == "closed":
            return closed_sign(middle, self.look.stop_radius, self.settings)
        size = 1.1 * self.type.body
        corner = (middle[0] - size / 2.0, middle[1] - size / 2.0)
        return step_free_sign(*corner, size, STEP_FREE_COLORS)

    def _sign(self, sign: str, piece: tuple[Point, Point]) -> tuple[PathShape, ...]:
        (left, y), (right, _) = piece
        middle = ((left + right) / 2.0, y)
        settings, body = self.settings, self.type.body
        full = self._stroke(piece, self.plain)
        if sign == "walk":
            return walk_shapes(polyline(piece), quiet(settings), settings.background, WALK_WIDTH_MM)
        if sign == "one-way":
            head = chevron(middle, (1.0, 0.0), 0.34 * _SAMPLE_WIDTH * body, settings.background)
            return (*full, head)
        if sign in ("step-free", "closed"):
            return self._alone(sign, middle)
        if sign == "terminus":
            half = self._stroke((middle, piece[1]), self.plain)
            return (*half, *marker("terminus", (middle,), (0.0, 1.0), self.look))
        if sign in _ON_A_LINE:
            return (*full, *marker(_ON_A_LINE[sign], (middle,), (0.0, 1.0), self.look))
        return self._stroke(piece, service_style(sign, self.plain))


def _block(
    block: TextBlock, size: float, fill: str, *, bold: bool, leading: float = LEADING
) -> tuple[TextShape, ...]:
    x, y = block.at
    return tuple(
        run(text, (x, y + i * leading * size), size, fill, bold=bold)
        for i, text in enumerate(block.lines)
    )
