"""The SVG keeps its promises to the web: size, hooks, titles, live text in place."""

from __future__ import annotations

import re
import xml.etree.ElementTree as ET
from collections import Counter
from dataclasses import replace

import pytest

from gtfs_schematic.drawing.compose import compose
from gtfs_schematic.drawing.model import Drawing, DrawingSettings, Group, TextShape
from gtfs_schematic.drawing.svg import to_svg
from gtfs_schematic.labels import fonts
from gtfs_schematic.labels.model import LabelledLayout

NS = "{http://www.w3.org/2000/svg}"
XML = "{http://www.w3.org/XML/1998/namespace}"


def parsed(data: bytes) -> ET.Element:
    return ET.fromstring(data)


@pytest.fixture(scope="session")
def root(drawing: Drawing) -> ET.Element:
    """Give the parsed SVG of each hand-made network."""
    return parsed(to_svg(drawing))


def groups(root: ET.Element, css_class: str) -> list[ET.Element]:
    return [g for g in root.iter(f"{NS}g") if g.get("class") == css_class]


def test_the_root_has_size_role_title_and_language(root: ET.Element, drawing: Drawing):
    assert root.get("width") == f"{drawing.width_mm:g}mm"
    assert root.get("height") == f"{drawing.height_mm:g}mm"
    assert root.get("viewBox") == f"0 0 {drawing.width_mm:g} {drawing.height_mm:g}"
    assert root.get("role") == "img"
    assert root.get("lang") == root.get(f"{XML}lang") == "en"
    assert [child.tag for child in root][:2] == [f"{NS}title", f"{NS}desc"]
    ids = [element.get("id") for element in root.iter() if element.get("id")]
    assert root.get("aria-labelledby", "").split() == ids
    assert all(root[i].text for i in (0, 1))


def test_every_line_has_one_group_with_a_path_per_stretch(
    root: ET.Element, labelled: LabelledLayout
):
    stretches = Counter(stretch.line_id for stretch in labelled.bundled.stretches)
    found = groups(root, "line")
    assert Counter(g.get("data-line") for g in found) == Counter(dict.fromkeys(stretches, 1))
    for group in found:
        paths = group.findall(f"{NS}path")
        assert len(paths) == stretches[group.get("data-line", "")]
        assert group[0].tag == f"{NS}title"
        assert group[0].text


def test_every_station_has_one_group_with_marker_and_name(
    root: ET.Element, labelled: LabelledLayout
):
    network = labelled.bundled.layout.network
    found = {g.get("data-station"): g for g in groups(root, "station")}
    assert sorted(found, key=str) == [s.id for s in network.stations]
    assert len(groups(root, "station")) == len(found)
    for station in network.stations:
        group = found[station.id]
        assert group[0].tag == f"{NS}title"
        assert station.name in (group[0].text or "")
        assert group.findall(f"{NS}path")
        names = [t for t in group.findall(f"{NS}text") if t.get("class") == "station-name"]
        assert " ".join(t.text or "" for t in names) == station.name


def test_there_is_one_key(root: ET.Element):
    assert len(groups(root, "key")) == 1


def test_only_texts_are_transformed(root: ET.Element):
    turned = [element.tag for element in root.iter() if element.get("transform")]
    assert set(turned) == {f"{NS}text"}


def test_texts_begin_where_they_should_and_are_as_wide_as_the_typeface_says(
    root: ET.Element, drawing: Drawing
):
    for text in root.iter(f"{NS}text"):
        assert text.get("text-anchor") is None
        bold = text.get("font-weight") == "700"
        size, given = float(text.get("font-size", "0")), float(text.get("textLength", "0"))
        assert fonts.text_width_mm(text.text or "", size, bold=bold) == pytest.approx(
            given, abs=0.03
        )
        if not text.get("transform"):
            assert float(text.get("x", "-1")) >= 0.0
            assert float(text.get("x", "0")) + given <= drawing.width_mm


def test_every_number_has_at_most_three_decimals(drawing: Drawing):
    _, _, body = to_svg(drawing).partition(b"<svg")
    assert not re.search(rb"\d\.\d{4,}", body)
    assert not re.search(rb"\d\.\d*0[\" ,LCZ]", body)


def test_the_same_drawing_gives_the_same_bytes(labelled: LabelledLayout, drawing: Drawing):
    again = compose(labelled, DrawingSettings())
    assert to_svg(again) == to_svg(compose(labelled, DrawingSettings()))
    assert to_svg(drawing) == to_svg(drawing)


def test_awkward_characters_survive_or_are_replaced():
    name = 'A<b> & "c" \u0001\ud7ff'
    text = TextShape(name, 1.0, 2.0, 3.0, "#000000", 10.0)
    drawing = Drawing(
        100.0, 80.0, name, name, "en", "#FFFFFF", (Group("x", (text,), {"line": name}, name),)
    )
    group = groups(parsed(to_svg(drawing)), "x")[0]
    expected = name.replace("\u0001", "\ufffd")
    assert group.get("data-line") == expected
    assert group.findtext(f"{NS}text") == expected
    assert group.findtext(f"{NS}title") == expected


def test_names_carry_the_feed_language(labelled: LabelledLayout):
    layout = labelled.bundled.layout
    info = replace(layout.network.info, lang="de")
    german = replace(
        labelled,
        bundled=replace(
            labelled.bundled, layout=replace(layout, network=replace(layout.network, info=info))
        ),
    )
    root = parsed(to_svg(compose(german, DrawingSettings())))
    names = [t for t in root.iter(f"{NS}text") if t.get("class") == "station-name"]
    assert {t.get("lang") for t in names} == {t.get(f"{XML}lang") for t in names} == {"de"}
