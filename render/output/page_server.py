"""A page served on loopback, with ranges so that its film can be scrubbed; to this machine alone.

A request that names another host is refused: a page from elsewhere could otherwise have this one read to it through
a name that it points at 127.0.0.1.
"""

from __future__ import annotations

import html
import re
from http import HTTPStatus
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from pathlib import Path
from typing import Any
from urllib.parse import unquote, urlsplit

from render.errors import LatepullError, MachineError
from render.output.page import FILES, INDEX

HOST = "127.0.0.1"
TYPES = {".html": "text/html; charset=utf-8", ".mp4": "video/mp4", ".jpg": "image/jpeg", ".png": "image/png",
         ".svg": "image/svg+xml", ".pdf": "application/pdf"}
CHUNK = 1 << 18
POLICY = re.compile(r'http-equiv="Content-Security-Policy" content="([^"]+)"')


class PageServer(ThreadingHTTPServer):
    """The server of one page: a folder's index.html and files, or a single file. Port 0 takes a free one."""

    daemon_threads = True

    def __init__(self, page: str | Path, port: int = 0) -> None:
        """page: the page's index.html or single file. Raises LatepullError (no page), MachineError (port taken)."""
        self.page = Path(page).resolve()
        try:
            with self.page.open(encoding="utf-8") as file:
                found = POLICY.search(file.read(4000))
        except (OSError, UnicodeDecodeError) as exc:
            raise LatepullError(f"no page to serve at {page}: {getattr(exc, 'strerror', None) or exc}") from exc
        if found is None:
            raise LatepullError(f"{page} is not a page that latepull made")
        self.policy = f"{html.unescape(found[1])}; frame-ancestors 'none'"
        try:
            super().__init__((HOST, port), _Handler)
        except (OSError, OverflowError) as exc:
            raise MachineError(f"can't listen on {HOST}:{port}: {getattr(exc, 'strerror', None) or exc}; "
                               "give --port another number, or none to take a free one") from exc

    @property
    def url(self) -> str:
        """Where a browser on this machine finds the page."""
        return f"http://{HOST}:{self.server_port}/"

    def handle_error(self, request: Any, client_address: Any) -> None:
        """A browser that stops reading in the middle of a film is no fault."""

    def file_of(self, path: str) -> Path | None:
        """The file an address names, None unless it belongs to the page."""
        name = unquote(urlsplit(path).path).lstrip("/")
        if name in ("", self.page.name):
            return self.page
        if self.page.name != INDEX:
            return None  # a single file has nothing beside it
        folder = (self.page.parent / FILES).resolve()
        try:
            file = (self.page.parent / name).resolve()
        except (OSError, ValueError):  # a NUL in the name, or a link in a ring
            return None
        return file if file.is_file() and file.parent == folder and file.suffix in TYPES else None


class _Handler(BaseHTTPRequestHandler):
    server: PageServer
    server_version = "latepull"
    sys_version = ""
    protocol_version = "HTTP/1.1"
    timeout = 60

    def log_message(self, format: str, *args: Any) -> None:
        """Nothing is printed from here."""

    def do_GET(self) -> None:
        """Send a file or a part of it."""
        self._answer(body=True)

    def do_HEAD(self) -> None:
        """As GET, without the body."""
        self._answer(body=False)

    def _answer(self, *, body: bool) -> None:
        if not self._known_host():
            self._refuse(HTTPStatus.MISDIRECTED_REQUEST, "this page is served to this machine alone")
            return
        file = self.server.file_of(self.path)
        if file is None:
            self._refuse(HTTPStatus.NOT_FOUND, "not a file of this page")
            return
        try:
            handle = file.open("rb")
        except OSError:
            self._refuse(HTTPStatus.NOT_FOUND, "a file of this page is missing")
            return
        with handle:
            size = file.stat().st_size
            try:
                wanted = byte_range(self.headers.get("Range"), size)
            except ValueError:
                self.send_response(HTTPStatus.REQUESTED_RANGE_NOT_SATISFIABLE)
                self._headers("text/plain; charset=utf-8", 0, f"bytes */{size}")
                return
            first, last = (0, size - 1) if wanted is None else wanted
            self.send_response(HTTPStatus.OK if wanted is None else HTTPStatus.PARTIAL_CONTENT)
            self._headers(TYPES.get(file.suffix, "application/octet-stream"), last - first + 1,
                          None if wanted is None else f"bytes {first}-{last}/{size}")
            if not body:
                return
            handle.seek(first)
            left = last - first + 1
            while left > 0 and (part := handle.read(min(CHUNK, left))):
                self.wfile.write(part)
                left -= len(part)

    def _known_host(self) -> bool:
        hosts = self.headers.get_all("Host") or []
        port = self.server.server_port
        return len(hosts) == 1 and hosts[0].lower() in {f"{name}:{port}" for name in (HOST, "localhost")}

    def _refuse(self, status: HTTPStatus, words: str) -> None:
        body = f"{words}\n".encode()
        self.close_connection = True
        self.send_response(status)
        self._headers("text/plain; charset=utf-8", len(body), None)
        if self.command != "HEAD":
            self.wfile.write(body)

    def _headers(self, kind: str, length: int, content_range: str | None) -> None:
        self.send_header("Content-Type", kind)
        self.send_header("Content-Length", str(length))
        self.send_header("Accept-Ranges", "bytes")
        if content_range is not None:
            self.send_header("Content-Range", content_range)
        self.send_header("Content-Security-Policy", self.server.policy)
        self.send_header("X-Content-Type-Options", "nosniff")
        self.send_header("Referrer-Policy", "no-referrer")
        self.send_header("Cross-Origin-Resource-Policy", "same-origin")
        self.send_header("Cache-Control", "no-store")
        self.end_headers()


def byte_range(header: str | None, size: int) -> tuple[int, int] | None:
    """First and last byte of a Range header (RFC 9110, 14.1.2), None for the whole file.

    Several ranges, another unit or nonsense are answered with the whole, as the RFC allows. Raises ValueError for a
    range outside the file.
    """
    found = re.fullmatch(r"bytes=(\d{0,18})-(\d{0,18})", header.strip()) if header else None
    if found is None or found[1] == found[2] == "":
        return None
    if found[1] == "":
        count = int(found[2])
        if count == 0 or size == 0:
            raise ValueError("no bytes are asked for")
        return max(size - count, 0), size - 1
    first = int(found[1])
    if found[2] != "" and int(found[2]) < first:
        return None
    if first >= size:
        raise ValueError("beyond the end")
    return first, size - 1 if found[2] == "" else min(int(found[2]), size - 1)
