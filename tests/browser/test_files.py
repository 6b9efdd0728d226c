"""Files in a real Chromium: study in, points kept, shortlist out and in again."""

import json

import jsonschema
import pytest
from playwright.sync_api import Page, expect

from engine import lasso_boundary, sorted_l1_boundary
from engine.schemas import shortlist_schema
from engine.study import STUDY_SCHEMA
from tests.browser.driver import ROOT, wait_exact

DEMO_SHORTLIST = ROOT / "assets" / "demo-shortlist.json"


def choose(page: Page, label: str) -> None:
    keep = page.get_by_role("group", name="Penalty to keep")
    keep.get_by_role("button", name=label, exact=True).click()
    pressed = page.get_by_role("group", name="Penalty to keep").get_by_role(
        "button", name=label, exact=True
    )
    expect(pressed).to_have_attribute("aria-pressed", "true")


def upload(page: Page, do: str, name: str, content: bytes) -> None:
    field = page.locator(f".page:not([hidden]) input[data-do={do}], .bar input[data-do={do}]")
    field.first.set_input_files(
        {"name": name, "mimeType": "application/json", "buffer": content}
    )


def exported(page: Page) -> str:
    with page.expect_download() as download:
        page.get_by_role("button", name="Export JSON").first.click()
    return download.value.path().read_text(encoding="utf-8")


def test_a_kept_point_is_exported_with_its_numbers(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    choose(page, "sorted L1")
    page.keyboard.press("k")
    expect(page.locator(".chip")).to_have_count(1)
    expect(page.locator(".strip .notice")).to_contain_text("Kept as A")
    file = json.loads(exported(page))
    jsonschema.Draft202012Validator(shortlist_schema()).validate(file)
    (point,) = file["points"]
    assert point["study"]["runs"] == 600
    assert point["predicted"] == {"tpp": 0.8, "fdp": sorted_l1_boundary(0.8, 0.3, 0.2)}
    assert point["limits"]["lasso"] is None
    assert sum(count for _, count in point["weights"]["normalised"]) == 2000
    page.get_by_role("tab", name="Shortlist").click()
    expect(page.locator(".sheet.table tbody tr")).to_have_count(1)
    expect(page.locator(".sheet.table table")).to_contain_text("0.711")


def test_a_penalty_without_a_point_cannot_be_kept(open_page, demo_url):
    page = open_page(demo_url)
    wait_exact(page)
    choose(page, "lasso")
    keep = page.get_by_role("button", name="Keep this point")
    expect(keep).to_be_disabled()
    expect(page.locator(".sheet.keep")).to_contain_text("no lasso has TPP 0.80")
    page.locator("#tpp").fill("0.4")
    page.keyboard.press("Enter")
    expect(keep).to_be_enabled()
    keep.click()
    expect(page.locator(".chip")).to_contain_text(f"FDP {lasso_boundary(0.4, 0.3, 0.2):.3f}")


def test_remove_and_undo(open_page, demo_url):
    page = open_page(demo_url)
    upload(page, "import", "s.json", DEMO_SHORTLIST.read_bytes())
    expect(page.locator(".chip")).to_have_count(3)
    page.get_by_role("button", name="Remove B").first.click()
    expect(page.locator(".chip")).to_have_count(2)
    page.get_by_role("button", name="Undo").click()
    expect(page.locator(".chip")).to_have_count(3)


def test_export_import_export_is_the_same_to_the_byte(open_page, demo_url):
    page = open_page(demo_url)
    upload(page, "import", "s.json", DEMO_SHORTLIST.read_bytes())
    expect(page.locator(".chip")).to_have_count(3)
    assert exported(page) == DEMO_SHORTLIST.read_text(encoding="utf-8")
    upload(page, "import", "s.json", DEMO_SHORTLIST.read_bytes())
    expect(page.locator(".strip .notice")).to_contain_text("0 added, 3 already there")
    expect(page.locator(".chip")).to_have_count(3)


def broken(change) -> bytes:
    file = json.loads(DEMO_SHORTLIST.read_text(encoding="utf-8"))
    change(file["points"][2])
    return json.dumps(file).encode()


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"{", "must be JSON"),
        (b"\xff\xfe", "must be UTF-8"),
        (broken(lambda p: p["study"].update(actives=2000)), "points[2].study.actives must be"),
        (broken(lambda p: p.update(nmae="x")), "points[2].nmae must be a known key; did you"),
        (broken(lambda p: p["predicted"].update(tpp=True)), "points[2].predicted.tpp must be"),
    ],
)
def test_a_bad_shortlist_is_refused_as_a_whole(open_page, demo_url, content, message):
    page = open_page(demo_url)
    wait_exact(page)
    choose(page, "sorted L1")
    page.keyboard.press("k")
    expect(page.locator(".chip")).to_have_count(1)
    upload(page, "import", "bad.json", content)
    expect(page.locator(".problem")).to_contain_text(message)
    expect(page.locator(".chip")).to_have_count(1)


def test_a_study_file_is_opened(open_page, empty_url):
    page = open_page(empty_url)
    study = {
        "schema": STUDY_SCHEMA, "title": "<b>Pilot</b>", "runs": 300, "candidates": 1000,
        "actives": 30, "noise_sd": 1, "effects": [{"size": 0.3, "share": 1}],
        "target": {"tpp": 0.6, "fdp": 0.1},
    }  # fmt: skip
    upload(page, "open", "study.json", json.dumps(study).encode())
    expect(page.locator("#runs")).to_have_value("300")
    expect(page.locator(".sheet.title input")).to_have_value("<b>Pilot</b>")
    expect(page.locator(".sheet.verdict")).to_contain_text("TPP 0.60 at FDP 0.10")


def test_a_file_that_is_too_large_is_refused_and_nothing_is_lost(open_page, demo_url):
    page = open_page(demo_url)
    upload(page, "open", "huge.json", b" " * 50_000_000)
    expect(page.locator(".problem")).to_contain_text("must be at most 1 MB, not 50 MB")
    expect(page.locator("#runs")).to_have_value("600")
    page.locator("#runs").fill("700")  # the connection still stands
    page.keyboard.press("Enter")
    expect(page.locator("#runs-per")).to_have_value("0.350")
