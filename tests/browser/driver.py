"""What the browser tests share: starting the command, and reading the page."""

import os
import socket
import subprocess
import sys
import time
import urllib.request
from pathlib import Path

from playwright.sync_api import Page

ROOT = Path(__file__).parents[2]
DEMO = ROOT / "assets" / "demo-study.json"

CHROMIUM_FLAGS = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
]


def free_port() -> int:
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return int(probe.getsockname()[1])


def start(*arguments: str) -> tuple[subprocess.Popen[bytes], str]:
    """Start the command on a free port and wait until it answers."""
    port = free_port()
    server = subprocess.Popen(
        [sys.executable, "-m", "app.cli", *arguments, "--port", str(port), "--no-browser"],
        cwd=ROOT,
        env={**os.environ, "OMP_NUM_THREADS": "1"},
    )
    url = f"http://127.0.0.1:{port}/"
    await_live(server, url)
    return server, url


def await_live(server: subprocess.Popen[bytes], url: str) -> None:
    """Wait until a server answers."""
    for _ in range(300):
        try:
            urllib.request.urlopen(url + "liveness", timeout=1).close()
            return
        except OSError:
            assert server.poll() is None, "the server ended while starting"
            time.sleep(0.1)
    raise AssertionError("the server does not answer")


def settle(page: Page) -> None:
    """Wait until the document is idle and has been answered."""
    page.wait_for_function(
        "window.Bokeh && Bokeh.documents.length && Bokeh.documents[0].is_idle", timeout=20_000
    )
    page.locator(".sheet.verdict p").first.wait_for()


def wait_exact(page: Page) -> None:
    """Wait until exact values stand in the words; the curves change in the same message."""
    page.locator('.sheet.verdict p[data-exact="true"]').wait_for(timeout=20_000)


def data(page: Page, name: str) -> dict[str, list[float]]:
    """Return the columns of a source in the browser."""
    return page.evaluate(
        """(name) => {
          const source = Bokeh.documents[0].get_model_by_name(name)
          return Object.fromEntries(Object.entries(source.data).map(([k, v]) => [k, [...v]]))
        }""",
        name,
    )


# From data to page coordinates, by the plane's own view.
_TO_PAGE = """([name, x, y]) => {
  const model = Bokeh.documents[0].get_model_by_name(name)
  const view = Bokeh.index.find_one(model)
  const box = view.canvas_view.el.getBoundingClientRect()
  const {x_range, y_range} = model
  const frame = view.frame.bbox
  return [
    box.left + frame.left + (x - x_range.start) / (x_range.end - x_range.start) * frame.width,
    box.top + frame.bottom - (y - y_range.start) / (y_range.end - y_range.start) * frame.height,
  ]
}"""


def place(page: Page, plane: str, x: float, y: float) -> tuple[float, float]:
    """Return where a point of a figure stands on the page."""
    left, top = page.evaluate(_TO_PAGE, [plane, x, y])
    return left, top
