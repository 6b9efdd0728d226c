"""The two handles follow the pointer, and both pictures and fields follow them."""

import pytest
from playwright.sync_api import Page, expect

from tests.browser.driver import data, place, wait_exact


def drag(page: Page, plane: str, start, *stops) -> None:
    page.mouse.move(*place(page, plane, *start))
    page.mouse.down()
    for stop in stops:
        page.mouse.move(*place(page, plane, *stop), steps=8)


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


@pytest.mark.parametrize(
    ("name", "plane"), [("Target", "tradeoff-plane"), ("Study", "phase-plane")]
)
def test_the_handle_stands_where_its_figure_has_it(open_page, demo_url, name, plane):
    page = open_page(demo_url)
    wait_exact(page)
    x, y = {"Target": (0.8, 0.75), "Study": (0.3, 0.2)}[name]
    disc = page.get_by_role("slider", name=name, exact=True).locator("> i").bounding_box()
    middle = (disc["x"] + disc["width"] / 2, disc["y"] + disc["height"] / 2)
    assert middle == pytest.approx(place(page, plane, x, y), abs=1.5)  # pixels


def test_keys_move_the_target(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    knob = page.get_by_role("slider", name="Target", exact=True)
    knob.focus()
    for key in ("ArrowLeft", "ArrowLeft", "ArrowDown", "Shift+ArrowDown"):
        page.keyboard.press(key)
    expect(page.locator("#tpp")).to_have_value("0.78")
    expect(page.locator("#fdp")).to_have_value("0.739")
    expect(knob).to_have_attribute("aria-valuetext", "TPP 0.78, FDP 0.739")
    expect(page.locator(".sheet.verdict .target")).to_have_text("TPP 0.78 at FDP 0.739")


def test_keys_move_the_study(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    page.get_by_role("slider", name="Study", exact=True).focus()
    page.keyboard.press("ArrowRight")
    # A hundredth of the plane's width, 0.6, in whole runs.
    expect(page.locator("#runs")).to_have_value("612")


def test_a_finger_moves_the_target(chromium, demo_url):
    context = chromium.new_context(viewport={"width": 390, "height": 844}, has_touch=True)
    page = context.new_page()
    page.goto(demo_url)
    wait_exact(page)
    finger = context.new_cdp_session(page)

    def touch(kind, *at):
        points = [{"x": at[0], "y": at[1]}] if at else []
        finger.send("Input.dispatchTouchEvent", {"type": kind, "touchPoints": points})

    touch("touchStart", *place(page, "tradeoff-plane", 0.8, 0.75))
    for share in (0.3, 0.6, 1.0):
        goal = (0.8 - 0.3 * share, 0.75 - 0.25 * share)
        touch("touchMove", *place(page, "tradeoff-plane", *goal))
    expect(page.locator(".sheet.verdict .target")).to_contain_text("TPP 0.5")
    touch("touchEnd")
    expect(page.locator("#tpp")).to_have_value("0.50")
    expect(page.locator("#fdp")).to_have_value("0.50")
    context.close()


def test_dragging_the_target_moves_the_contours_live(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    before = data(page, "needs")
    drag(page, "tradeoff-plane", (0.8, 0.75), (0.6, 0.5))
    page.wait_for_function(
        "(old) => Bokeh.documents[0].get_model_by_name('needs').data.lasso[20] !== old",
        arg=before["lasso"][20],
    )
    page.mouse.up()


def test_escape_takes_a_drag_back(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    drag(page, "tradeoff-plane", (0.8, 0.75), (0.6, 0.5))
    expect(page.locator("#tpp")).to_have_value("0.60")
    page.keyboard.press("Escape")
    expect(page.locator("#tpp")).to_have_value("0.80")
    page.mouse.up()
