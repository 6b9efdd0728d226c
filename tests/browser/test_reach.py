"""Reach in a real Chromium: what the hand does, the pictures and the words follow."""

import math

import pytest
from playwright.sync_api import Page, expect

from engine import (
    critical_sparsity,
    lasso_boundary,
    power_limit,
    sorted_l1_boundary,
    two_level_boundary,
    two_level_closed_form,
)
from tests.browser.driver import data, wait_exact


def slider(page: Page, name: str):
    return page.get_by_role("slider", name=name)


def evaluated(tpp: list[float]) -> list[int]:
    """Indices of the nodes at which the searched boundaries are evaluated: every second one on
    either side of the power limit, which stands twice."""
    split = next((i for i in range(1, len(tpp)) if tpp[i] == tpp[i - 1]), len(tpp))
    return [*range(2, split, 2), *range(split, len(tpp), 2)]


def lasso_end(page: Page) -> float:
    """TPP at which the drawn lasso curve ends."""
    curves = data(page, "tradeoff-curves")
    pairs = zip(curves["tpp"], curves["lasso"], strict=True)
    return max(u for u, q in pairs if q is not None and not math.isnan(q))


def press(page: Page, name: str, key: str, source: str) -> None:
    """Press a key on a slider and wait until the browser has the source's new data."""
    before = data(page, source)
    slider(page, name).focus()
    page.keyboard.press(key)
    page.wait_for_function(
        """([name, before]) => {
          const source = Bokeh.documents[0].get_model_by_name(name)
          const now = source.data
          return Object.entries(before).some(([k, v]) => String([...now[k]]) !== String(v))
        }""",
        arg=[source, before],
    )


def test_the_pictures_show_the_contract_functions(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    curves = data(page, "tradeoff-curves")
    nodes = evaluated(curves["tpp"])
    for key, boundary, slack in (
        ("two-level-closed-form", two_level_closed_form, 1e-4),  # drawn, not evaluated
        (
            "two-level",
            two_level_boundary,
            5e-6,
        ),  # the function's own values, rounded as the TPPs
        ("sorted-l1", sorted_l1_boundary, 5e-6),
    ):
        expected = boundary([curves["tpp"][i] for i in nodes], 0.3, 0.2)
        drawn = [curves[key][i] for i in nodes]
        assert drawn == pytest.approx(expected.tolist(), abs=slack)
    limit = power_limit(0.3, 0.2)
    below = [i for i in nodes if curves["tpp"][i] < 0.999 * limit]
    drawn = [curves["lasso"][i] for i in below]
    expected = lasso_boundary([curves["tpp"][i] for i in below], 0.3, 0.2)
    assert drawn == pytest.approx(expected.tolist(), abs=1e-4)
    beyond = [q for u, q in zip(curves["tpp"], curves["lasso"], strict=True) if u > limit]
    assert beyond
    assert all(q is None or math.isnan(q) for q in beyond)
    transition = data(page, "transition")
    expected = critical_sparsity(transition["ratio"][1:])
    assert transition["sparsity"][1:] == pytest.approx(expected.tolist())


def test_the_verdict_gives_the_numbers_of_the_contract_functions(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    verdict = page.locator(".sheet.verdict")
    expect(verdict).to_contain_text("TPP 0.80 at FDP 0.75 is out of reach of the lasso")
    for number in (
        power_limit(0.3, 0.2),
        two_level_boundary(0.8, 0.3, 0.2),
        sorted_l1_boundary(0.8, 0.3, 0.2),
    ):
        expect(verdict).to_contain_text(f"{number:.3f}")


def test_a_slider_moves_the_curves_and_the_study(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    limit = lasso_end(page)
    press(page, "Runs", "ArrowRight", "study")
    page.locator('.sheet.verdict p[data-exact="false"]').wait_for()  # words follow the planes
    wait_exact(page)
    runs = int(page.locator("#runs").input_value().replace("\u202f", ""))
    assert runs > 600
    assert data(page, "study") == {"x": [runs / 2000], "y": [0.2]}
    assert lasso_end(page) > limit
    curves = data(page, "tradeoff-curves")
    some = next(i for i in evaluated(curves["tpp"]) if curves["tpp"][i] > 0.7)
    expected = sorted_l1_boundary(curves["tpp"][some], runs / 2000, 0.2)
    # Both columns are rounded to 1e-6.
    assert curves["sorted-l1"][some] == pytest.approx(expected, abs=5e-6)


def test_count_and_ratio_are_bound_both_ways(open_page, demo_url):
    page = open_page(demo_url)
    page.locator("#runs-per").fill("0.5")
    page.keyboard.press("Enter")
    expect(page.locator("#runs")).to_have_value("1\u202f000")
    page.locator("#actives").fill("150")
    page.keyboard.press("Enter")
    expect(page.locator("#actives-per")).to_have_value("0.075")
    page.locator("#candidates").fill("4000")
    page.keyboard.press("Enter")
    expect(page.locator("#runs-per")).to_have_value("0.250")
    page.get_by_role("button", name="ratios").click()
    page.locator("#candidates").fill("2000")
    page.keyboard.press("Enter")
    expect(page.locator("#runs")).to_have_value("500")
    expect(page.locator("#runs-per")).to_have_value("0.250")
    expect(page.locator("#actives")).to_have_value("75")


def test_the_target_follows_its_fields_and_sliders(open_page, demo_url):
    page = open_page(demo_url)
    press(page, "TPP at least", "ArrowLeft", "target")
    assert data(page, "target")["x"] == [0.79]
    press(page, "FDP at most", "Shift+ArrowRight", "target")
    assert data(page, "target")["y"] == [0.751]
    page.locator("#fdp").fill("0.9")
    page.keyboard.press("Enter")
    expect(page.locator(".sheet.verdict")).to_contain_text("picking at random")


def test_a_ratio_that_is_no_whole_count_is_shown_as_it_was_rounded(open_page, demo_url):
    page = open_page(demo_url)
    page.locator("#runs-per").fill("0.30001")
    page.keyboard.press("Enter")
    expect(page.locator("#runs-per")).to_have_value("0.300")


@pytest.mark.parametrize(
    ("field", "text", "message"),
    [
        ("#actives", "2000", "actives must be smaller than candidates (2000), not 2000"),
        ("#actives", "0", "actives must be a whole number at least 1"),
        ("#runs", "many", "runs must be a whole number"),
        ("#actives-per", "0", "sparsity must be a finite number above 0 and below 1, not 0"),
        ("#actives-per", "1", "sparsity must be a finite number above 0 and below 1, not 1"),
        ("#tpp", "1.2", "tpp must be a finite number above 0 and at most 1, not 1.2"),
        ("#fdp", "nan", "fdp must be a finite number above 0 and below 1, not nan"),
        ("#runs", "<img src=x onerror=alert(1)>", "not '<img src=x onerror=alert(1)>'"),
    ],
)
def test_bad_input_names_field_rule_and_value(open_page, demo_url, field, text, message):
    page = open_page(demo_url)
    wait_exact(page)
    before = data(page, "tradeoff-curves")
    page.locator(field).fill(text)
    page.keyboard.press("Enter")
    expect(page.locator(".sheet.verdict .problem")).to_contain_text(message)
    expect(page.locator(field)).to_have_attribute("aria-invalid", "true")
    expect(page.locator(".page.reach")).to_have_class("page reach wrong")
    assert str(data(page, "tradeoff-curves")) == str(before)  # the last good picture stays
    page.locator("#tpp").fill("0.5")
    page.keyboard.press("Enter")
    expect(page.locator(".sheet.verdict .problem")).to_have_count(0)
    expect(page.locator("#actives")).to_have_value("400")


def test_the_empty_page_asks_for_a_study_and_opens_the_example(open_page, empty_url):
    page = open_page(empty_url)
    expect(page.locator(".sheet.verdict")).to_contain_text("Type runs, candidates, actives")
    page.get_by_role("button", name="Open the example").click()
    expect(page.locator(".sheet.verdict")).to_contain_text("TPP 0.80 at FDP 0.75")
    wait_exact(page)


def test_counts_typed_into_the_empty_page_make_a_study(open_page, empty_url):
    page = open_page(empty_url)
    for field, text in (("#candidates", "1000"), ("#runs", "250"), ("#actives", "40")):
        page.locator(field).fill(text)
        page.keyboard.press("Enter")
    wait_exact(page)
    assert data(page, "study") == {"x": [0.25], "y": [0.04]}
    floor = sorted_l1_boundary(0.8, 0.25, 0.04)
    expect(page.locator(".sheet.verdict")).to_contain_text(f"{floor:.3f}")


def test_two_windows_do_not_share_a_study(open_page, demo_url):
    one, other = open_page(demo_url), open_page(demo_url)
    one.locator("#runs").fill("900")
    one.keyboard.press("Enter")
    expect(one.locator("#runs-per")).to_have_value("0.450")
    assert data(other, "study")["x"] == [0.3]


def test_penalties_can_be_hidden_and_hatched(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    page.get_by_role("checkbox", name="sorted L1").uncheck()
    expect(page.locator(".row.sorted-l1")).to_have_count(0)
    page.get_by_role("button", name="Hatch where two-level cannot get").click()
    page.wait_for_function(
        """() => {
          const {hatch, ...fdp} = Bokeh.documents[0].get_model_by_name("tradeoff-curves").data
          return String([...hatch]) === String([...fdp["two-level"]])
        }"""
    )


def test_every_control_has_a_name(open_page, demo_url):
    page = open_page(demo_url)
    nameless = page.evaluate(
        """() => {
          const deep = (root) => [...root.querySelectorAll("*")].flatMap(
            (e) => [e, ...(e.shadowRoot ? deep(e.shadowRoot) : [])])
          return deep(document).filter((e) => e.matches("button, input, select, textarea"))
            .filter((e) => !e.closest("[hidden]") && e.type !== "hidden")
            .filter((e) => !(e.ariaLabel || e.labels?.length || e.textContent.trim()))
            .map((e) => e.outerHTML)
        }"""
    )
    assert nameless == []


@pytest.mark.parametrize("size", [(1440, 900), (390, 844), (768, 1024), (2560, 1440)])
def test_nothing_spills_over_the_screen(open_page, demo_url, size):
    page = open_page(demo_url, *size)
    wait_exact(page)
    assert page.evaluate("document.documentElement.scrollWidth") <= size[0]
    box = page.locator(".plane.tradeoff .canvas").bounding_box()
    assert box["width"] > 250
    assert box["height"] > 200


def test_dark_reaches_page_and_canvas(open_page, demo_url):
    page = open_page(demo_url)
    page.get_by_role("button", name="Dark").click()
    expect(page.locator("html")).to_have_attribute("data-theme", "dark")
    page.wait_for_function(
        """() => Bokeh.documents[0].get_model_by_name("phase-plane")
          .below[0].major_label_text_color === "#9DADB8" """
    )
