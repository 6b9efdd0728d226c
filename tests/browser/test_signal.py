"""The Signal page in the browser: belief, answers, table, sentence."""

import pytest
from playwright.sync_api import expect

from engine import predict
from engine.study import load_study
from tests.browser.driver import DEMO, data


def opened(open_page, url):
    page = open_page(url)
    page.get_by_role("tab", name="Signal").click()
    wait_answers(page)
    return page


def wait_answers(page):
    page.locator('.page.signal .verdict p[data-exact="true"]').wait_for(timeout=90_000)


def test_the_table_tells_what_the_engine_predicts(open_page, demo_url):
    page = opened(open_page, demo_url)
    study = load_study(DEMO.read_bytes())
    for label, rule, column in (("designed", "two-stage", 4), ("lasso", "two-stage-bh", 5)):
        row = page.locator(".gains tbody tr").filter(has_text=label).first
        value = predict(study, label, rule, fdp=study.target.fdp).tpp
        cells = row.locator("b").all_inner_texts()
        assert f"{value:.3f}" in cells, column
    assert len(data(page, "gains-lasso")["x_cut"]) == 60


def test_noise_and_effects_change_the_answer(open_page, demo_url):
    page = opened(open_page, demo_url)
    before = page.locator(".gains tbody").inner_text()
    page.locator("#noise_sd").fill("2")
    page.keyboard.press("Enter")
    expect(page.locator(".effect span").first).to_have_text("z 2.0")
    wait_answers(page)
    after = page.locator(".gains tbody").inner_text()
    assert after != before


def test_effects_are_added_and_dropped(open_page, demo_url):
    page = opened(open_page, demo_url)
    page.get_by_role("button", name="Add effect").click()
    expect(page.locator(".effect")).to_have_count(3, timeout=15_000)
    page.get_by_label("Remove effect 1").click()
    expect(page.locator(".effect")).to_have_count(2, timeout=15_000)
    page.get_by_label("share").first.fill("0.3")
    page.keyboard.press("Tab")
    expect(page.get_by_label("share").nth(1)).to_have_value("0.7", timeout=15_000)


@pytest.mark.parametrize(("text", "words"), [("0", "size must be"), ("big", "size must be")])
def test_a_wrong_effect_is_named_and_nothing_is_lost(open_page, demo_url, text, words):
    page = opened(open_page, demo_url)
    page.get_by_label("size per SD").first.fill(text)
    page.keyboard.press("Enter")
    expect(page.locator(".error-line")).to_contain_text(f"effects[0].{words}")
    expect(page.get_by_label("size per SD").first).to_have_value("0.16")


def test_a_link_opens_the_page_with_its_belief(open_page, demo_url):
    page = opened(open_page, demo_url)
    page.locator("#noise_sd").fill("1.5")
    page.keyboard.press("Enter")
    page.wait_for_function("() => location.search.includes('noise_sd=1.5')")
    page.reload()
    wait_answers(page)
    expect(page.locator("#noise_sd")).to_have_value("1.50")
