"""The drift page works in a real browser: Debian's Chromium, without a network."""

from __future__ import annotations

import io
import os
import re
import shutil
from pathlib import Path

import pytest
import small_diagrams
from playwright.sync_api import Page, sync_playwright
from pypdf import PdfReader

from gtfs_schematic.drift.limits import judge, parse_limit
from gtfs_schematic.drift.measure import measure_edition
from gtfs_schematic.drift.page import to_html

DIAGRAM = small_diagrams.comb()
REPORT = measure_edition(DIAGRAM)
WORKED = small_diagrams.two_ways()


@pytest.fixture(scope="module")
def browser():
    """Start Chromium; skip the tests where it is missing, but not under continuous integration."""
    program = shutil.which("chromium")
    if program is None:
        reason = "no chromium on this machine (Debian and Ubuntu: apt install chromium)"
        if os.environ.get("CI"):
            pytest.fail(reason)
        pytest.skip(reason)
    with sync_playwright() as playwright:
        # Containers run as root, for whom Chromium has no sandbox; the page is our own.
        started = playwright.chromium.launch(executable_path=program, args=["--no-sandbox"])
        yield started
        started.close()


@pytest.fixture(scope="module")
def files(tmp_path_factory) -> dict[str, Path]:
    folder = tmp_path_factory.mktemp("pages")
    limits = judge(REPORT, [parse_limit("residual=1e-9"), parse_limit("bearing-over-90=0")])
    pages = {
        "comb": to_html(REPORT, DIAGRAM, title="Two rows", limits=limits),
        "worked": to_html(measure_edition(WORKED), WORKED, title="Two ways"),
    }
    for name, data in pages.items():
        (folder / f"{name}.html").write_bytes(data)
    return {name: folder / f"{name}.html" for name in pages}


@pytest.fixture
def visit(browser, files):
    """Open pages offline, and demand afterwards that nothing went wrong or was asked for."""
    trouble: list[str] = []
    contexts = []

    def opened(name: str, **options: object) -> Page:
        context = browser.new_context(offline=True, **options)
        contexts.append(context)
        page = context.new_page()
        page.set_default_timeout(5000)
        page.on("console", lambda message: trouble.append(message.text))
        page.on("pageerror", lambda error: trouble.append(str(error)))
        page.on("request", lambda request: requests.append(request.url))
        page.goto(files[name].as_uri())
        return page

    requests: list[str] = []
    yield opened
    for context in contexts:
        context.close()
    assert trouble == []
    assert {url for url in requests if not url.startswith("data:")} <= {
        file.as_uri() for file in files.values()
    }


def places(page: Page) -> list[tuple[float, float]]:
    return page.eval_on_selector_all(
        ".net .stations circle",
        "all => all.map(c => [Number(c.getAttribute('cx')), Number(c.getAttribute('cy'))])",
    )


def ends(page: Page) -> list[tuple[float, float]]:
    """Give the first point of every link."""
    courses = page.eval_on_selector_all(
        ".net .courses path", "all => all.map(p => p.getAttribute('d'))"
    )
    return [tuple(map(float, re.match(r"M([\d.]+) ([\d.]+)", d).groups())) for d in courses]


def test_the_slider_moves_stations_and_links_between_ground_and_diagram(visit):
    page = visit("comb")
    slider = page.get_by_role("slider", name="From the ground to the diagram")
    drawn, links_drawn = places(page), ends(page)
    slider.focus()
    page.keyboard.press("Home")
    assert slider.get_attribute("aria-valuetext") == "ground"
    true, links_true = places(page), ends(page)
    page.evaluate(
        "() => { const m = document.getElementById('move'); m.value = 50;"
        " m.dispatchEvent(new Event('input')); }"
    )
    between = places(page)
    assert drawn != true
    for a, b, c in zip(true, between, drawn, strict=True):
        assert b == pytest.approx([(a[0] + c[0]) / 2, (a[1] + c[1]) / 2], abs=0.11)
    # On the ground both rows are 4000 m long and 4000 m apart: as wide as high.
    width = max(x for x, _ in true) - min(x for x, _ in true)
    height = max(y for _, y in true) - min(y for _, y in true)
    assert width == pytest.approx(height, rel=0.01)
    # Links begin where their stations are, at either end.
    starts = [
        next(i for i, s in enumerate(DIAGRAM.stations) if s.id == k.start) for k in DIAGRAM.links
    ]
    for links, stations in ((links_drawn, drawn), (links_true, true)):
        for i, point in zip(starts, links, strict=True):
            assert point == pytest.approx(stations[i], abs=0.11)
    page.keyboard.press("End")
    assert places(page) == drawn


def test_a_row_marks_its_station_and_says_it(visit):
    page = visit("comb")
    page.get_by_text("Stations (10)").click()
    button = page.locator("#stations").get_by_role("button", name="Stop B4", exact=True)
    button.click()
    ring = page.locator(".net .marks .ring")
    index = [s.id for s in DIAGRAM.stations].index("b4")
    at = [float(ring.get_attribute(key)) for key in ("cx", "cy")]
    assert at == pytest.approx(places(page)[index], abs=0.11)
    assert page.locator(".net .marks text").text_content() == "Stop B4"
    assert page.locator("tr[aria-current=true]").count() == 1
    assert page.get_by_text("Stop B4 is drawn").is_visible()
    # The mark moves with its station.
    page.get_by_role("slider").press("Home")
    moved = [float(ring.get_attribute(key)) for key in ("cx", "cy")]
    assert moved == pytest.approx(places(page)[index], abs=0.11)
    assert moved != at
    button.press("Enter")
    assert ring.count() == 0
    button.press("Enter")
    page.keyboard.press("Escape")
    assert (ring.count(), page.locator("tr[aria-current]").count()) == (0, 0)


def test_a_link_is_marked_along_its_course(visit):
    page = visit("comb")
    page.get_by_text("Links (8)").click()
    page.locator("#links").get_by_role("button", name="Stop A0 – Stop A1").click()
    assert page.locator(".net .routes .way.seen").count() == 1
    assert page.locator(".net .marks .ring").count() == 2


def test_a_journey_shows_both_ways(visit):
    page = visit("worked")
    page.locator("#journeys").get_by_role("button", name="Stop A – Stop D").click()
    seen, fast = (
        page.locator(f".net .routes .way.{kind}").get_attribute("d") for kind in ("seen", "fast")
    )
    net = [f"{x:.1f} {y:.1f}" for x, y in places(page)]
    for stop, here, there in ((1, seen, fast), (2, fast, seen)):
        assert net[stop] in here
        assert net[stop] not in there
    said = page.locator("#said").text_content()
    assert "Looks shortest: line 1 to Stop D. Fastest: line 2 to Stop D." in said


def test_marks_can_be_seen_close_up(visit):
    page = visit("comb")
    net = page.locator("svg.net")
    whole = [float(value) for value in net.get_attribute("viewBox").split()]
    page.get_by_text("Links (8)").click()
    row = page.locator("#links").get_by_role("button", name="Stop B3 – Stop B4")
    row.click()
    page.get_by_role("checkbox", name="marks close up").check()
    left, top, width, height = (float(value) for value in net.get_attribute("viewBox").split())
    assert width < 0.5 * whole[2]
    assert width / height == pytest.approx(whole[2] / whole[3], rel=0.01)
    for x, y in places(page)[-2:]:
        assert left < x < left + width
        assert top < y < top + height
    row.click()
    assert [float(value) for value in net.get_attribute("viewBox").split()] == whole


def test_a_station_on_the_picture_leads_to_its_row(visit):
    page = visit("comb")
    page.locator(".net .stations circle").nth(7).click()
    row = page.locator("tr[aria-current=true]")
    assert row.get_by_role("button", name="Stop B2", exact=True).is_visible()


def test_heads_sort_up_and_down(visit):
    page = visit("comb")
    page.get_by_text("Stations (10)").click()
    table = page.locator("#stations")

    def column(number: int) -> list[str]:
        return table.locator(f"tbody tr td:nth-child({number})").all_text_contents()

    head = table.get_by_role("columnheader", name="Displaced, m")
    for way in ("descending", "ascending"):
        head.get_by_role("button").click()
        assert head.get_attribute("aria-sort") == way
        values = [float(text) for text in column(2)]
        assert values == sorted(values, reverse=way == "descending")
    table.get_by_role("button", name="Station", exact=True).click()
    assert column(1) == sorted(column(1))
    assert head.get_attribute("aria-sort") is None


def test_colors_and_parts_can_be_chosen(visit):
    page = visit("comb")
    station = page.locator(".net .stations circle").first
    fill = "e => getComputedStyle(e).fill"
    before = station.evaluate(fill)
    page.get_by_role("radio", name="scale").check()
    assert station.evaluate(fill) != before
    assert page.get_by_text("under 0.5 of the typical scale").is_visible()
    for name, part in (("arrows", ".arrows"), ("grid", ".grid")):
        page.get_by_role("checkbox", name=name).uncheck()
        assert page.locator(f".net {part}").evaluate("e => getComputedStyle(e).display") == "none"


def test_everything_can_be_reached_by_keyboard_and_has_a_name(visit):
    page = visit("comb")
    reached = []
    for _ in range(12):
        page.keyboard.press("Tab")
        reached.append(page.evaluate("document.activeElement.id || document.activeElement.type"))
    assert reached[0] == "move"
    assert {"radio", "checkbox"} <= set(reached)
    nameless = page.evaluate(
        """() => [...document.querySelectorAll("input, button, [role=region]")].filter(e =>
            !(e.labels && e.labels.length) && !e.getAttribute("aria-label") &&
            !e.textContent.trim()).map(e => e.outerHTML)"""
    )
    assert nameless == []
    assert page.locator("html").get_attribute("lang") == "en"
    assert page.get_by_role("img", name="The network of Two rows as drawn").count() == 1
    assert page.get_by_role("heading", level=1).text_content() == "Drift of Two rows"


@pytest.mark.parametrize("width", [360, 800, 1600])
def test_the_page_fits_screens(visit, width):
    page = visit("comb", viewport={"width": width, "height": 800})
    assert page.evaluate("document.documentElement.scrollWidth <= innerWidth")


def test_paper_holds_what_the_screen_folds_away(visit):
    page = visit("comb")
    text = "".join(sheet.extract_text() for sheet in PdfReader(io.BytesIO(page.pdf())).pages)
    for name in ("Stop A0", "Stop B4", "residual=1e-09", "exceeded", "octant-agreement"):
        assert name in text
    assert "Color shows" not in text


def test_without_scripts_the_page_can_be_read(visit):
    page = visit("comb", java_script_enabled=False)
    page.get_by_text("Stations (10)").click()
    assert page.get_by_role("button", name="Stop B4", exact=True).is_visible()
    assert page.locator(".net .stations circle").count() == 10
    assert page.get_by_text("What holds").is_visible()
