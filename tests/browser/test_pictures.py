"""The pictures around the planes: contours, crosshair, loupe, small plots, stand-in."""

import numpy as np
import pytest
from playwright.sync_api import expect

from engine import power_limit, sorted_l1_boundary
from engine.limits.needed import lasso_needs
from tests.browser.driver import data, place, wait_exact


def test_contours_stand_for_the_target(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    needs = data(page, "needs")
    some = slice(5, -1)  # both columns are rounded to 1e-6, which counts at the ends
    exact = lasso_needs(0.8, 0.75, np.array(needs["sparsity"][some]))
    assert needs["lasso"][some] == pytest.approx(exact.tolist(), abs=1e-5)
    # On its line a study's lowest FDP is the target's: as near as the lines are drawn.
    k = 20
    there = sorted_l1_boundary(0.8, needs["sorted-l1"][k], needs["sparsity"][k])
    assert there == pytest.approx(0.75, abs=3e-3)


def test_the_crosshair_tells_every_curve_at_the_pointer(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    page.mouse.move(*place(page, "tradeoff-plane", 0.5, 0.2))
    heading = page.locator(".names .block .heading")
    expect(heading).to_contain_text("at TPP 0.50")
    curves = data(page, "tradeoff-curves")
    for key in ("sorted-l1", "two-level", "lasso"):
        value = np.interp(0.5, curves["tpp"], np.nan_to_num(curves[key]))
        expect(page.locator(f".names .row.{key} dd")).to_have_text(f"{value:.2f}")
    page.mouse.move(*place(page, "by-sparsity", 0.9, 0.2))  # one line through all pictures
    expect(heading).to_contain_text("at TPP 0.9")
    expect(page.locator(".names .row.lasso dd")).to_have_text("none")
    page.mouse.move(5, 5)
    expect(heading).to_contain_text("at TPP 0.80")
    expect(page.locator(".names .row.sorted-l1 dd")).to_have_text("0.711")


def test_the_phase_plane_tells_the_power_limit_at_the_pointer(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    page.mouse.move(*place(page, "phase-plane", 0.2, 0.3))
    told = page.evaluate(
        """() => {
          const figure = Bokeh.documents[0].get_model_by_name("phase-plane")
          return figure.renderers.map((r) => r.data_source?.data.text?.[0] ?? "")
            .find((text) => text.includes(": power limit"))
        }"""
    )
    assert told == f"0.20, 0.30: power limit {power_limit(0.2, 0.3):.2f}"


def test_the_loupe_follows_the_target(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    ranges = """() => {
      const {x_range: x, y_range: y} = Bokeh.documents[0].get_model_by_name("loupe-plane")
      return [x.start, x.end, y.start, y.end]
    }"""
    loupe = page.locator(".loupe")
    expect(loupe).to_be_visible()
    assert page.evaluate(ranges) == pytest.approx([0.74, 0.86, 0.70, 0.80])
    expect(loupe).to_have_attribute("data-side", "right")
    page.locator("#tpp").fill("0.9")
    page.locator("#fdp").fill("0.3")
    page.keyboard.press("Enter")
    page.locator("#runs").fill("1900")  # the curves come down to the corner of the loupe
    page.keyboard.press("Enter")
    expect(loupe).to_have_attribute("data-side", "left")


def test_small_plots_follow_the_study(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    before = data(page, "by-sparsity-curves"), data(page, "by-ratio-curves")
    page.locator("#runs").fill("700")
    page.keyboard.press("Enter")
    expect(page.locator("#runs-per")).to_have_value("0.350")
    wait_exact(page)
    after = data(page, "by-sparsity-curves"), data(page, "by-ratio-curves")
    assert after[0]["c1"] != before[0]["c1"]  # at another sampling ratio
    assert after[1]["c1"] == before[1]["c1"]  # at the same sparsity
    curves, saved = data(page, "tradeoff-curves"), data(page, "saved-curves")
    # Both are rounded to 1e-6.
    expected = curves["lasso"][30] - curves["sorted-l1"][30]
    assert saved["sorted-l1"][30] == pytest.approx(expected, abs=2e-6)


@pytest.mark.parametrize(
    ("keeping", "stands_at"), [("its TPP", (0.8, 0.711)), ("its FDP", (None, 0.55))]
)
def test_the_point_that_would_be_kept_is_shown_and_kept(
    open_page, demo_url, keeping, stands_at
):
    page = open_page(demo_url)
    wait_exact(page)
    page.locator("#fdp").fill("0.55")
    page.keyboard.press("Enter")
    wait_exact(page)
    button = page.get_by_role("button", name=keeping, exact=True)
    button.click()
    expect(button).to_have_attribute("aria-pressed", "true")
    shown = data(page, "stand-in")
    page.keyboard.press("k")
    expect(page.locator(".chip")).to_have_count(1)
    kept = data(page, "kept")
    assert (kept["x"][0], kept["y"][0]) == pytest.approx(
        (shown["x"][0], shown["y"][0]),
        abs=2e-3,  # the preview is read off the curves
    )
    assert (kept["x_target"], kept["y_target"]) == ([0.8], [0.55])
    for value, wanted in zip((kept["x"][0], kept["y"][0]), stands_at, strict=True):
        assert wanted is None or value == pytest.approx(wanted, abs=5e-4)
