"""Serve one page to this machine alone; nothing is written, nothing else can be fetched."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from http import HTTPStatus
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer

from gtfs_schematic.errors import UsageError

_HOST = "127.0.0.1"


@contextmanager
def serving(page: bytes, port: int) -> Iterator[ThreadingHTTPServer]:
    """Give a server of one page, bound to the loopback address, and close it at the end.

    Parameters
    ----------
    page
        An HTML page in UTF-8.
    port
        Port to bind; 0 takes a free one.

    Raises
    ------
    UsageError
        If the port cannot be bound.
    """
    try:
        server = ThreadingHTTPServer((_HOST, port), _handler(page))
    except OSError as error:
        raise UsageError(
            f"port {port}: cannot be used ({error.strerror or error}). "
            "Give another with --port, or 0 for any free one."
        ) from error
    try:
        yield server
    finally:
        server.server_close()


def _handler(page: bytes) -> type[BaseHTTPRequestHandler]:
    """Make the handler that knows one page."""

    class Handler(BaseHTTPRequestHandler):
        """Answers requests for the page, and refuses everything else."""

        def do_GET(self) -> None:
            """Send the page."""
            # A name other than the loopback's would be a foreign page's way in (DNS rebinding).
            host = self.headers.get("Host", "").rsplit(":", 1)[0]
            if host not in (_HOST, "localhost"):
                self.send_error(HTTPStatus.FORBIDDEN)
            elif self.path != "/":
                self.send_error(HTTPStatus.NOT_FOUND)
            else:
                self.send_response(HTTPStatus.OK)
                self.send_header("Content-Type", "text/html; charset=utf-8")
                self.send_header("Content-Length", str(len(page)))
                self.send_header(
                    "Content-Security-Policy", "default-src 'none'; style-src 'unsafe-inline'"
                )
                self.end_headers()
                self.wfile.write(page)

        def log_message(self, format: str, *args: object) -> None:  # noqa: A002 - its name there
            """Keep quiet."""

    return Handler
