"""Kept points in the browser: words, order, coming back; and the address as a link."""

from playwright.sync_api import expect

from tests.browser.driver import data, wait_exact


def kept_two(open_page, url):
    page = open_page(url)
    wait_exact(page)
    page.keyboard.press("k")
    expect(page.locator(".chip")).to_have_count(1)
    page.locator("#runs").fill("700")
    page.keyboard.press("Enter")
    expect(page.locator("#runs-per")).to_have_value("0.350")
    wait_exact(page)
    page.get_by_role("button", name="two-level", exact=True).click()
    page.keyboard.press("k")
    expect(page.locator(".chip")).to_have_count(2)
    return page


def test_a_click_on_a_kept_point_brings_its_study_back(open_page, demo_url):
    page = kept_two(open_page, demo_url)
    page.locator(".chip .opens").first.click()
    expect(page.locator("#runs")).to_have_value("600")
    expect(page.locator("[data-key='keep-as-sorted-l1']")).to_have_attribute(
        "aria-pressed", "true"
    )


def test_names_notes_and_order(open_page, demo_url):
    page = kept_two(open_page, demo_url)
    page.get_by_role("tab", name="Shortlist").click()
    page.get_by_label("Name of A").fill("Narrow <net>")
    page.get_by_label("Note on B").fill("ask the lab")
    page.keyboard.press("Enter")
    expect(page.locator(".table .notice")).to_contain_text("renamed")
    page.get_by_label("Move down A").last.click()
    expect(page.get_by_label("Name of B")).to_have_value("Narrow <net>")
    expect(page.get_by_label("Note on A")).to_have_value("ask the lab")
    page.locator(".table").get_by_role("button", name="Undo").click()
    expect(page.get_by_label("Name of A")).to_have_value("Narrow <net>")
    page.locator(".table").get_by_label("Remove A").click()
    expect(page.locator(".table tbody tr")).to_have_count(1)
    page.locator(".table").get_by_role("button", name="Undo").click()
    expect(page.locator(".table tbody tr")).to_have_count(2)


def test_the_address_reopens_the_view(open_page, demo_url):
    page = kept_two(open_page, demo_url)
    page.get_by_role("button", name="Dark").click()
    page.get_by_role("button", name="Hatch where sorted L1 cannot get").click()
    page.get_by_role("tab", name="Shortlist").click()
    page.wait_for_function("() => location.search.includes('hatched=sorted-l1')")
    curves = data(page, "tradeoff-curves")
    page.reload()
    # On the page of the table the verdict is there, but hidden.
    page.locator('.sheet.verdict p[data-exact="true"]').wait_for(state="attached")
    assert page.evaluate("document.documentElement.dataset.theme") == "dark"
    expect(page.get_by_role("tab", name="Shortlist")).to_have_attribute("aria-selected", "true")
    expect(page.locator(".table tbody tr")).to_have_count(2)
    expect(page.locator("#runs")).to_have_value("700")
    assert data(page, "tradeoff-curves") == curves


def test_copy_link_copies_the_address(open_page, demo_url):
    page = kept_two(open_page, demo_url)
    page.context.grant_permissions(["clipboard-read", "clipboard-write"])
    page.get_by_role("button", name="Copy link").click()
    expect(page.get_by_role("button", name="Copied")).to_be_visible()
    link = page.evaluate("navigator.clipboard.readText()")
    assert link == page.url
    other = open_page(link)
    wait_exact(other)
    expect(other.locator("#runs")).to_have_value("700")
    expect(other.locator(".chip")).to_have_count(2)


def test_a_bad_link_says_so_and_works(open_page, empty_url):
    page = open_page(f"{empty_url}?runs=-5&candidates=2000&actives=10")
    expect(page.locator(".verdict .problem")).to_contain_text("link: runs must be")
    page.get_by_role("button", name="Example").click()
    wait_exact(page)
