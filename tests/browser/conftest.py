"""A real Chromium against a real server, both started once."""

import shutil
from collections.abc import Callable, Iterator

import pytest
from playwright.sync_api import Browser, Page, Playwright, sync_playwright

from tests.browser.driver import CHROMIUM_FLAGS, DEMO, settle, start


@pytest.fixture(scope="session")
def demo_url() -> Iterator[str]:
    server, url = start(str(DEMO))
    yield url
    server.terminate()
    assert server.wait(10) == 0


@pytest.fixture(scope="session")
def empty_url() -> Iterator[str]:
    server, url = start()
    yield url
    server.terminate()
    assert server.wait(10) == 0


@pytest.fixture(scope="session")
def playwright_driver() -> Iterator[Playwright]:
    with sync_playwright() as driver:
        yield driver


@pytest.fixture(scope="session")
def chromium(playwright_driver: Playwright) -> Iterator[Browser]:
    found = shutil.which("chromium") or shutil.which("chromium-browser")
    browser = playwright_driver.chromium.launch(executable_path=found, args=CHROMIUM_FLAGS)
    yield browser
    browser.close()


@pytest.fixture
def open_page(chromium: Browser) -> Iterator[Callable[..., Page]]:
    """Open pages that fail the test on any error in them and any request to elsewhere."""
    wrong: list[str] = []
    contexts = []

    def open_(url: str, width: int = 1440, height: int = 900) -> Page:
        context = chromium.new_context(viewport={"width": width, "height": height})
        contexts.append(context)
        page = context.new_page()
        page.set_default_timeout(20_000)
        origin = url.partition("?")[0]
        own = (origin, "data:", "blob:", origin.replace("http", "ws"))
        page.on("pageerror", lambda error: wrong.append(f"page error: {error}"))
        page.on("console", lambda m: m.type == "error" and wrong.append(f"console: {m.text}"))
        page.on("request", lambda r: r.url.startswith(own) or wrong.append(f"outside: {r.url}"))
        page.goto(url, timeout=60_000)
        settle(page)
        return page

    yield open_
    for context in contexts:
        context.close()
    assert wrong == []
