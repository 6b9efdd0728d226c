"""One step of a slider, and of a handle under the hand: from the event to changed data.

Both are seen by the page's own clock, with all curves and contours live. The real page stands
against a bare one that sends as many numbers, over equal sockets and with equal gathering of
slider events, in turns within one run.
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
from tests.browser.driver import (
    CHROMIUM_FLAGS,
    DEMO,
    ROOT,
    await_live,
    data,
    free_port,
    place,
    start,
)

__all__ = ["latency_ratios"]

STEPS, WARM_UP, ROUNDS = 100, 5, 3

# What a change of the study sends at once; names, words and small pictures follow.
STUDY = ["study", "tradeoff-curves"]

_WATCH = """(names) => {
  const doc = Bokeh.documents[0]
  window.stamps = {}
  for (const name of names) {
    const source = doc.get_model_by_name(name)
    source.properties.data.change.connect(() => { window.stamps[name] = performance.now() })
  }
  const begin = () => { window.begun = performance.now(); window.stamps = {} }
  addEventListener("keydown", begin, true)
  addEventListener("pointermove", begin, true)
}"""
_DONE = "(names) => names.every((name) => name in window.stamps)"
# A step begins when the one before has been painted, as it does for a hand that looks.
_PAINTED = """() => new Promise((done) => {
  requestAnimationFrame(() => requestAnimationFrame(() => setTimeout(done, 0)))
})"""
_TOOK = "(names) => Math.max(...names.map((name) => window.stamps[name])) - window.begun"


def latency_ratios() -> list[Ratio]:
    """Return the ratios of the medians and of the 95th percentiles, slider and handle."""
    real, url = start(str(DEMO))
    try:
        with sync_playwright() as driver:
            found = shutil.which("chromium") or shutil.which("chromium-browser")
            browser = driver.chromium.launch(executable_path=found, args=CHROMIUM_FLAGS)
            page = _opened(browser.new_page(), url)
            page.evaluate(_WATCH, STUDY)
            with _bare_server(*_sent(page, STUDY)) as bare_url:
                bare = _opened(browser.new_page(), bare_url)
                bare.evaluate(_WATCH, ["bare"])
                rounds = [
                    (_keys(page, "input[aria-label=Runs]", STUDY),
                     _drags(page),
                     _keys(bare, ".noUi-handle", ["bare"]))
                    for _ in range(ROUNDS)
                ]  # fmt: skip
            browser.close()
    finally:
        real.terminate()
        real.wait(10)
    slider, handle, theirs = (np.concatenate(each) for each in zip(*rounds, strict=True))
    return [
        Ratio(f"{what} step, {name}", "bare page", float(at(ours) / at(theirs)), 1.5)
        for what, ours in (("slider", slider), ("handle", handle))
        for name, at in (("median", np.median), ("p95", lambda t: np.percentile(t, 95)))
    ]


def _opened(page: Page, url: str) -> Page:
    page.set_viewport_size({"width": 1440, "height": 900})
    page.goto(url)
    page.wait_for_function(
        "window.Bokeh && Bokeh.documents.length && Bokeh.documents[0].is_idle"
    )
    return page


def _sent(page: Page, names: list[str]) -> tuple[int, int]:
    """Rows and columns of one source that holds as many numbers as a step sends."""
    sizes = page.evaluate(
        """(names) => names.map((name) => Object.values(
             Bokeh.documents[0].get_model_by_name(name).data).map((each) => each.length))""",
        names,
    )
    rows = max(map(max, sizes))
    return rows, round(sum(map(sum, sizes)) / rows)


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


def _keys(page: Page, slider: str, names: list[str]) -> np.ndarray:
    page.bring_to_front()
    page.locator(slider).first.focus()
    times = []
    for i in range(WARM_UP + STEPS):
        page.keyboard.press("ArrowRight" if i // 50 % 2 == 0 else "ArrowLeft")
        page.wait_for_function(_DONE, arg=names, timeout=5000)
        times.append(page.evaluate(_TOOK, names))
        page.evaluate(_PAINTED)
    return np.array(times[WARM_UP:])


def _drags(page: Page) -> np.ndarray:
    """Drag the study over its plane, two pixels at a time."""
    page.bring_to_front()
    x, y = place(page, "phase-plane", *(data(page, "study")[name][0] for name in ("x", "y")))
    page.mouse.move(x, y)
    page.mouse.down()
    times = []
    for i in range(WARM_UP + STEPS):
        x += 2 if i // 25 % 2 == 0 else -2
        page.mouse.move(x, y)
        page.wait_for_function(_DONE, arg=STUDY, timeout=5000)
        times.append(page.evaluate(_TOOK, STUDY))
        page.evaluate(_PAINTED)
    page.mouse.up()
    return np.array(times[WARM_UP:])
