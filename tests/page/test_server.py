"""Serving: ranges as RFC 9110 wants them, this machine's names only, nothing but the page, an ordinary end."""

from __future__ import annotations

import http.client
import os
import signal
import subprocess
import sys
from pathlib import Path

import pytest

from render.errors import LatepullError, MachineError
from render.output.page_server import PageServer, byte_range

FILM = "/files/scene1.mp4"


def ask(
    server: PageServer, path: str, headers: dict[str, str] | None = None, method: str = "GET"
) -> tuple[http.client.HTTPResponse, bytes]:
    connection = http.client.HTTPConnection("127.0.0.1", server.server_port, timeout=10)
    connection.request(method, path, headers=headers or {})
    response = connection.getresponse()
    body = response.read()
    connection.close()
    return response, body


# RFC 9110, 14.1.2: first-last, from first on, the last n; and what may be answered with the whole.
@pytest.mark.parametrize(("header", "wanted"), [
    (None, None), ("bytes=0-0", (0, 0)), ("bytes=10-19", (10, 19)), ("bytes=90-", (90, 99)), ("bytes=-5", (95, 99)),
    ("bytes=-500", (0, 99)), ("bytes=50-500", (50, 99)), ("bytes=20-10", None), ("bytes=0-1,4-5", None),
    ("lines=0-1", None), ("bytes=-", None), ("bytes=a-b", None),
])  # fmt: skip
def test_ranges(header: str | None, wanted: tuple[int, int] | None) -> None:
    assert byte_range(header, 100) == wanted


@pytest.mark.parametrize("header", ["bytes=100-", "bytes=200-300", "bytes=-0"])
def test_ranges_outside(header: str) -> None:
    with pytest.raises(ValueError):
        byte_range(header, 100)


def test_a_part_of_the_film(server: PageServer, page_folder: Path) -> None:
    film = (page_folder / "files/scene1.mp4").read_bytes()
    response, body = ask(server, FILM, {"Range": "bytes=100-299"})
    assert (response.status, body) == (206, film[100:300])
    assert response.getheader("Content-Range") == f"bytes 100-299/{len(film)}"
    response, body = ask(server, FILM)
    assert (response.status, body, response.getheader("Accept-Ranges")) == (200, film, "bytes")
    response, body = ask(server, FILM, {"Range": f"bytes={len(film)}-"})
    assert (response.status, response.getheader("Content-Range")) == (416, f"bytes */{len(film)}")
    response, body = ask(server, FILM, method="HEAD")
    assert (response.status, body, response.getheader("Content-Length")) == (200, b"", str(len(film)))


OTHERS = ("other.example", "other.example:{port}", "127.0.0.1", "127.0.0.1:1", "192.168.0.9:{port}")


@pytest.mark.parametrize("host", OTHERS)
def test_other_hosts_names_are_refused(server: PageServer, host: str) -> None:
    response, body = ask(server, "/", {"Host": host.format(port=server.server_port)})
    assert response.status == 421 and b"<html" not in body


def test_localhost_is_this_machine(server: PageServer) -> None:
    response, body = ask(server, "/", {"Host": f"localhost:{server.server_port}"})
    assert response.status == 200 and b"<html" in body
    assert "default-src 'none'" in (policy := response.getheader("Content-Security-Policy") or "")
    assert "frame-ancestors 'none'" in policy and "unsafe" not in policy
    assert response.getheader("X-Content-Type-Options") == "nosniff"


def test_it_listens_on_loopback_alone(server: PageServer) -> None:
    assert server.server_address[0] == "127.0.0.1"


@pytest.mark.parametrize("path", ["/page.json", "/../index.html", "/files/../page.json", "/files/%2e%2e/page.json",
                                  "/files/..%2fpage.json", "//etc/passwd", "/files/%00", "/files", "/files/none.mp4"])
def test_nothing_but_the_page(server: PageServer, path: str) -> None:
    response, _ = ask(server, path)
    assert response.status == 404


def test_only_reading(server: PageServer) -> None:
    response, _ = ask(server, "/", method="POST")
    assert response.status == 501


def test_no_page_and_a_taken_port(server: PageServer, tmp_path: Path) -> None:
    with pytest.raises(LatepullError, match="no page to serve"):
        PageServer(tmp_path / "index.html")
    (tmp_path / "index.html").write_text("<html>", encoding="utf-8")
    with pytest.raises(LatepullError, match="not a page that latepull made"):
        PageServer(tmp_path / "index.html")
    with pytest.raises(MachineError, match="can't listen"):
        PageServer(server.page, server.server_port)


def test_ctrl_c_is_the_ordinary_end(page_folder: Path) -> None:
    script = ("import argparse, sys; from pathlib import Path; from render.command_page import serve; "
              "sys.exit(serve(Path(sys.argv[1]), argparse.Namespace(port=0, no_open=True)))")
    process = subprocess.Popen([sys.executable, "-c", script, str(page_folder / "index.html")], stderr=subprocess.PIPE,
                               text=True, env={**os.environ})
    assert process.stderr is not None
    try:
        assert "this machine only" in process.stderr.readline()
        process.send_signal(signal.SIGINT)
        assert process.wait(timeout=10) == 0
        assert process.stderr.read() == "stopped\n"
    finally:
        process.kill()
        process.wait()
        process.stderr.close()
