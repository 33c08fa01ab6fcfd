"""Whatever a feed writes into a name stays a name, in every file."""

from __future__ import annotations

import io
from dataclasses import replace
from xml.etree import ElementTree as ET

import drawn_networks
import drawn_sheets
import pypdf
import pytest

from gtfs_schematic.drawing.compose import compose
from gtfs_schematic.drawing.listing import to_text
from gtfs_schematic.drawing.pdf import to_pdf
from gtfs_schematic.drawing.svg import to_svg

NAMES = (
    "<script>alert(1)</script>",
    "Fish & Chips",
    "\"Quoted\" 'Square'",
    "]]></title><a href='javascript:x'>",
    "\u202etfeL\u202c Turn",
    "&lt;b&gt; &#60;",
    "{{ x }} ${y} %s",
)
ALLOWED = {"svg", "title", "desc", "rect", "g", "path", "text"}
SVG = "{http://www.w3.org/2000/svg}"
STEERING = "\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069"


def hostile(name: str):
    """Give a scene in which station, line, publisher and credit all have this name."""
    layout = drawn_networks.star()
    network = layout.network
    line = replace(network.lines[0], name=name, long_name=name)
    station = replace(network.stations[0], name=name, second_name=name)
    network = replace(
        network,
        info=replace(network.info, publisher=name, attributions=(name,)),
        lines=(line, *network.lines[1:]),
        stations=(station, *network.stations[1:]),
    )
    layout = drawn_sheets.on_page(replace(layout, network=network))
    labelled = drawn_sheets.naive_labels(drawn_sheets.naive_bundle(layout))
    return network, compose(labelled, drawn_sheets.SETTINGS)


@pytest.mark.parametrize("name", NAMES)
def test_names_are_text_and_nothing_else(name: str):
    network, drawing = hostile(name)
    root = ET.fromstring(to_svg(drawing))
    assert {element.tag.removeprefix(SVG) for element in root.iter()} <= ALLOWED
    for element in root.iter():
        assert not [key for key in element.attrib if key.lower().startswith("on") or "href" in key]
    shown = "".join(char for char in name if char not in STEERING)
    texts = {element.text for element in root.iter(f"{SVG}text")}
    assert shown in texts
    page = pypdf.PdfReader(io.BytesIO(to_pdf(drawing))).pages[0]
    assert "/Annots" not in page
    text = to_text(network, drawn_sheets.SETTINGS).decode()
    assert f"LINE {shown}" in text
    assert not any(mark in text for mark in STEERING)
