"""The server: this machine only, orderly stops, and a page that says when it is gone."""

import re
import signal
import socket
import subprocess
import sys
import urllib.error
import urllib.request
from pathlib import Path

import pytest
from bokeh.server.views.ws import WSHandler
from playwright.sync_api import expect

from app.server import quicken_sockets
from tests.browser.driver import DEMO, ROOT, start


def port_of(url: str) -> int:
    return int(re.search(r":(\d+)/", url).group(1))


def test_it_listens_on_the_loopback_address_only(demo_url):
    if sys.platform != "linux":
        pytest.skip("listening sockets are listed on Linux only")
    table = Path("/proc/net/tcp").read_text()
    listening = [line.split()[1] for line in table.splitlines()[1:] if line.split()[3] == "0A"]
    ours = [
        address for address in listening if int(address.split(":")[1], 16) == port_of(demo_url)
    ]
    assert ours == [f"0100007F:{port_of(demo_url):04X}"]


def test_a_foreign_host_header_is_refused(demo_url):
    request = urllib.request.Request(demo_url, headers={"Host": "example.org"})
    with pytest.raises(urllib.error.HTTPError) as refused:
        urllib.request.urlopen(request)
    assert refused.value.code == 403
    assert b"Bokeh" not in refused.value.read()
    refused.value.close()


def test_a_foreign_origin_gets_no_socket(demo_url):
    port = port_of(demo_url)
    with socket.create_connection(("127.0.0.1", port)) as link:
        link.sendall(
            f"GET /ws HTTP/1.1\r\nHost: 127.0.0.1:{port}\r\nUpgrade: websocket\r\n"
            "Connection: Upgrade\r\nSec-WebSocket-Version: 13\r\n"
            "Sec-WebSocket-Key: AAAAAAAAAAAAAAAAAAAAAA==\r\n"
            "Origin: http://example.org\r\n\r\n".encode()
        )
        assert b" 403 " in link.recv(200)


def test_answers_carry_security_headers(demo_url):
    with urllib.request.urlopen(demo_url) as answer:
        assert "default-src 'self'" in answer.headers["Content-Security-Policy"]
        assert answer.headers["X-Content-Type-Options"] == "nosniff"


def test_sockets_are_quick():
    quicken_sockets()
    assert WSHandler.open.quick


@pytest.mark.parametrize("how", [signal.SIGINT, signal.SIGTERM])
def test_it_stops_in_order_and_the_page_says_so(chromium, how):
    server, url = start(str(DEMO))
    page = chromium.new_page()
    page.goto(url)
    page.wait_for_function(
        "window.Bokeh && Bokeh.documents.length && Bokeh.documents[0].is_idle"
    )
    server.send_signal(how)
    assert server.wait(10) == 0
    expect(page.locator(".lost")).to_be_visible()
    page.close()


def test_a_taken_port_is_an_error_when_it_was_asked_for(demo_url):
    command = [
        sys.executable,
        "-m",
        "app.cli",
        "--no-browser",
        "--port",
        str(port_of(demo_url)),
    ]
    done = subprocess.run(command, cwd=ROOT, capture_output=True, text=True, timeout=60)
    assert done.returncode == 1
    assert done.stderr.strip().splitlines()[-1].startswith("sparsereach: port")
