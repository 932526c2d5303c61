"""Pages about trust in a real browser: accessible, within the screen, usable without and with script."""

from __future__ import annotations

import re

import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, Page, expect

AXE = Axe()
PATHS = [
    "/checks",
    "/checks?subject=optical%20density",
    "/differences",
    "/differences?wavelength_nm=1064&time_s=1e-8&target=skin",
    "/differences?wavelength_nm=1,064",
    "/changes",
    "/guide",
    "/guide/inputs",
    "/guide/coverage",
    "/guide/api",
    "/guide/tables",
    "/guide/operation",
]


@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("width", [320, 1280])
def test_pages_are_accessible_and_fit(browser: Browser, address: str, scheme: str, width: int) -> None:
    """No violation found by axe, no sideways scroll of the page."""
    context = browser.new_context(
        viewport={"width": width, "height": 800},
        color_scheme=scheme,
        base_url=address,  # type: ignore[arg-type]
    )
    page = context.new_page()
    for path in PATHS:
        page.goto(path)
        found = AXE.run(page).response["violations"]
        assert [(v["id"], [n["target"] for n in v["nodes"]]) for v in found] == [], path
        assert page.evaluate("document.documentElement.scrollWidth") <= width, path
    context.close()


def test_two_rule_sets_by_keyboard(page: Page) -> None:
    page.goto("/differences")
    page.get_by_label("Wavelength", exact=True).fill("1310")
    page.get_by_label("Second rule set").select_option("ansi-z136-1-2014")
    page.get_by_label("Wavelength", exact=True).press("Enter")
    expect(page).to_have_url(re.compile("second=ansi-z136-1-2014.*wavelength_nm=1310"))
    expect(page.get_by_role("img", name="Limit against time at 1310 nm, eye")).to_be_visible()
    slider = page.get_by_label("Read the chart at a time")
    slider.focus()
    slider.press("ArrowRight")
    expect(page.locator("output").nth(1)).to_contain_text("ICNIRP 2013")


def test_from_any_page_to_the_checks(page: Page) -> None:
    page.get_by_role("link", name="Published checks").click()
    expect(page.get_by_text("checks are met")).to_be_visible()
    page.get_by_role("link", name="Beams").click()
    expect(page.get_by_role("heading", level=2)).to_have_text(["Beams"])
