"""The two handles follow the pointer, and both pictures and fields follow them."""

import pytest
from playwright.sync_api import Page, expect

from tests.browser.driver import data, wait_exact

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


def drag(page: Page, plane: str, start, *stops) -> None:
    page.mouse.move(*page.evaluate(_TO_PAGE, [plane, *start]))
    page.mouse.down()
    for stop in stops:
        page.mouse.move(*page.evaluate(_TO_PAGE, [plane, *stop]), steps=8)


def test_the_target_follows_the_pointer_and_rests_on_hundredths(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    drag(page, "tradeoff-plane", (0.8, 0.75), (0.6, 0.5), (0.403, 0.302))
    expect(page.locator(".sheet.verdict .target")).to_contain_text("TPP 0.40")  # live
    held = data(page, "target")
    assert (held["x"][0], held["y"][0]) == pytest.approx((0.403, 0.302), abs=0.004)
    page.mouse.up()
    expect(page.locator("#tpp")).to_have_value("0.40")
    expect(page.locator("#fdp")).to_have_value("0.30")
    wait_exact(page)
    assert data(page, "target") == {"x": [0.4], "y": [0.3]}


def test_the_study_follows_the_pointer_and_moves_the_curves(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    before = data(page, "tradeoff-curves")["sorted-l1"]
    drag(page, "phase-plane", (0.3, 0.2), (0.4, 0.1), (0.5, 0.05))
    expect(page.locator("#runs-per")).to_have_value("0.500", timeout=3000)
    expect(page.locator("#actives-per")).to_have_value("0.050")
    assert data(page, "tradeoff-curves")["sorted-l1"] != before
    page.mouse.up()
    wait_exact(page)
    assert data(page, "study") == {"x": [0.5], "y": [0.05]}


def test_a_drag_that_starts_elsewhere_moves_nothing(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    drag(page, "tradeoff-plane", (0.2, 0.9), (0.4, 0.4))
    page.mouse.up()
    page.wait_for_timeout(200)
    assert data(page, "target") == {"x": [0.8], "y": [0.75]}


def test_the_handle_stops_at_the_edges(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    drag(page, "tradeoff-plane", (0.8, 0.75), (0.9, 0.05), (1.2, -0.2))
    page.mouse.up()
    expect(page.locator("#tpp")).to_have_value("1.00")
    expect(page.locator("#fdp")).to_have_value("0.01")
