"""One slider step: from the key press to changed data, both seen by the page's own clock.

The real page against a bare one that sends as many numbers, over equal sockets and with equal
gathering of slider events, in turns within one run.
"""

import os
import shutil
import subprocess
import sys
from collections.abc import Iterator
from contextlib import contextmanager

import numpy as np
from playwright.sync_api import Page, sync_playwright

from tests.bench.engine_ratios import Ratio
from tests.browser.driver import CHROMIUM_FLAGS, DEMO, ROOT, await_live, free_port, start

__all__ = ["latency_ratios"]

STEPS, WARM_UP, ROUNDS = 100, 5, 3

_WATCH = """(names) => {
  const doc = Bokeh.documents[0]
  window.stamps = {}
  for (const name of names) {
    const source = doc.get_model_by_name(name)
    source.properties.data.change.connect(() => { window.stamps[name] = performance.now() })
  }
  const press = () => { window.pressed = performance.now(); window.stamps = {} }
  addEventListener("keydown", press, true)
}"""
_DONE = "(names) => names.every((name) => name in window.stamps)"
_TOOK = "(names) => Math.max(...names.map((name) => window.stamps[name])) - window.pressed"


def latency_ratios() -> list[Ratio]:
    """Return the ratios of the medians and of the 95th percentiles."""
    real, url = start(str(DEMO))
    try:
        with sync_playwright() as driver:
            found = shutil.which("chromium") or shutil.which("chromium-browser")
            browser = driver.chromium.launch(executable_path=found, args=CHROMIUM_FLAGS)
            page = _opened(browser.new_page(), url, "input[aria-label=Runs]")
            names = ["study", "tradeoff-curves"]
            page.evaluate(_WATCH, names)
            with _bare_server(*_sent(page)) as bare_url:
                bare = _opened(browser.new_page(), bare_url, ".noUi-handle")
                bare.evaluate(_WATCH, ["bare"])
                rounds = [(_steps(page, names), _steps(bare, ["bare"])) for _ in range(ROUNDS)]
            browser.close()
    finally:
        real.terminate()
        real.wait(10)
    ours, theirs = (np.concatenate(side) for side in zip(*rounds, strict=True))
    return [
        Ratio(f"slider step, {name}", "bare page", float(at(ours) / at(theirs)), 1.5)
        for name, at in (("median", np.median), ("p95", lambda t: np.percentile(t, 95)))
    ]


def _opened(page: Page, url: str, slider: str) -> Page:
    page.set_viewport_size({"width": 1440, "height": 900})
    page.goto(url)
    page.wait_for_function(
        "window.Bokeh && Bokeh.documents.length && Bokeh.documents[0].is_idle"
    )
    page.locator(slider).first.focus()
    return page


def _sent(page: Page) -> tuple[int, int]:
    """Rows and columns of the largest source that a step sends."""
    columns = page.evaluate(
        """() => Object.values(Bokeh.documents[0].get_model_by_name("tradeoff-curves").data)
                       .map((column) => column.length)"""
    )
    return columns[0], len(columns)


@contextmanager
def _bare_server(rows: int, columns: int) -> Iterator[str]:
    port = free_port()
    command = [
        sys.executable,
        "-m",
        "tests.bench.bare_page",
        str(port),
        str(rows),
        str(columns),
    ]
    server = subprocess.Popen(command, cwd=ROOT, env={**os.environ, "OMP_NUM_THREADS": "1"})
    url = f"http://127.0.0.1:{port}/"
    try:
        await_live(server, url)
        yield url
    finally:
        server.terminate()
        server.wait(10)


def _steps(page: Page, names: list[str]) -> np.ndarray:
    page.bring_to_front()
    times = []
    for i in range(WARM_UP + STEPS):
        page.keyboard.press("ArrowRight" if i // 50 % 2 == 0 else "ArrowLeft")
        page.wait_for_function(_DONE, arg=names, timeout=5000)
        times.append(page.evaluate(_TOOK, names))
    return np.array(times[WARM_UP:])
