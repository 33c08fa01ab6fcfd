"""An edition is shown on one page, to this machine alone."""

from __future__ import annotations

import re
import threading
import urllib.error
import urllib.request
from html.parser import HTMLParser

import pytest

from gtfs_schematic.edition.model import Edition, EditionFeed, EditionLine, EditionLink
from gtfs_schematic.edition.model import EditionStation as Station
from gtfs_schematic.edition.save import to_json
from gtfs_schematic.errors import EditionError, UsageError
from gtfs_schematic.review.page import page, page_of_folder
from gtfs_schematic.review.serve import serving

SVG = b'<?xml version="1.0"?>\n<svg viewBox="0 0 9 9"><title>t</title></svg>'
EDITION = Edition(
    title="A & <B>",
    feed=EditionFeed("0" * 64, "P", "v", "2026-03-01", "", "2026-03-11"),
    width_mm=100.0,
    height_mm=100.0,
    stations=(
        Station("a", "Ärger <x>", ("a",), 10.0, 50.0, 10, 50, "terminus", ("1",), "a"),
        Station("b", "Beta", ("b",), 10.1, 50.0, 40, 50, "terminus", ("1",), "b"),
    ),
    links=(EditionLink("a-b", "a", "b", ("1",), ((10, 50), (40, 50))),),
    lines=(EditionLine("1", "One", "#AA0000", "#FFFFFF", ("r",), (("a", "b"),)),),
    left_out=(("route", "r9", "no trips on this date"),),
    findings=("warning: stops.txt, row 4: odd",),
)


class Balance(HTMLParser):
    """Counts open tags, to see that every one is closed."""

    def __init__(self) -> None:
        super().__init__()
        self.open: list[str] = []
        self.text: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Push."""
        del attrs
        if tag not in {"meta", "br", "input"}:
            self.open.append(tag)

    def handle_endtag(self, tag: str) -> None:
        """Pop the same."""
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        """Keep the text."""
        self.text.append(data)


def test_the_page_says_what_the_edition_says():
    html = page(EDITION, SVG).decode()
    reader = Balance()
    reader.feed(html)
    assert reader.open == []
    text = " ".join(reader.text)
    for part in ("A & <B>", "Ärger <x>", "One", "Ärger <x> – Beta", "route r9: no trips on this"):
        assert part in text
    assert "warning: stops.txt, row 4: odd" in text
    assert "not to scale" in text
    assert "<?xml" not in html


def test_the_page_needs_nothing_else():
    html = page(EDITION, SVG).decode()
    assert not re.search(r"<script|<link|src\s*=|url\(|@import|href=\"(?!#)", html)


def test_a_folder_without_a_diagram_is_named(tmp_path):
    (tmp_path / "edition.json").write_bytes(to_json(EDITION))
    with pytest.raises(EditionError, match=r"diagram.svg: cannot read the diagram"):
        page_of_folder(tmp_path)
    (tmp_path / "diagram.svg").write_bytes(b"nothing")
    with pytest.raises(EditionError, match="no <svg> element"):
        page_of_folder(tmp_path)


@pytest.fixture
def address():
    with serving(b"<p>hello</p>", 0) as server:
        thread = threading.Thread(target=server.serve_forever, kwargs={"poll_interval": 0.01})
        thread.start()
        yield server.server_address
        server.shutdown()
        thread.join()


def get(address: tuple[str, int], path: str = "/", host: str = "127.0.0.1") -> tuple[int, bytes]:
    url = f"http://{address[0]}:{address[1]}{path}"
    request = urllib.request.Request(url, headers={"Host": host})
    opener = urllib.request.build_opener(urllib.request.ProxyHandler({}))
    try:
        with opener.open(request, timeout=5) as answer:
            return answer.status, answer.read()
    except urllib.error.HTTPError as error:
        with error:
            return error.code, b""


def test_the_page_is_served_to_this_machine_alone(address):
    assert address[0] == "127.0.0.1"
    assert get(address) == (200, b"<p>hello</p>")


def test_nothing_else_is_served(address):
    assert get(address, "/../../etc/passwd")[0] == 404
    assert get(address, "/edition.json")[0] == 404
    assert get(address, host="evil.example")[0] == 403


def test_a_taken_port_is_named(address):
    with (
        pytest.raises(UsageError, match=f"port {address[1]}: cannot be used"),
        serving(b"", address[1]),
    ):
        pass
