"""Unmeasured and measured lasers in a real browser: filled in, accessible, without sideways scroll."""

from __future__ import annotations

from pathlib import Path

import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, Page, expect

from tests.profile.images import as_file, gaussian

AXE = Axe()


def test_bounds_lead_into_an_evaluation_that_says_so(page: Page) -> None:
    page.goto("/before-first-light")
    page.get_by_label("Gain medium").select_option("nd-yag")
    for label, text in {
        "Pump power": "20",
        "Length of the medium": "50",
        "Optical length": "250",
        "Output mirror reflects": "90",
        "Mode diameter": "0.8",
    }.items():
        page.get_by_label(label, exact=True).fill(text)
    page.get_by_role("button", name="Find the bounds").click()
    expect(page.get_by_role("heading", level=1)).to_contain_text("Bound, not measured")
    expect(page.locator("figure.chart svg").first).to_be_visible()
    page.get_by_role("link", name="Evaluate First pulse").click()
    expect(page.get_by_text("Bound, not measured: the figures entered")).to_be_visible()
    expect(page.get_by_label("Where the figures come from")).to_have_value("bound")
    page.get_by_role("link", name="tolerances", exact=True).click()
    page.get_by_label("Energy of one pulse, line 1", exact=True).fill("10 %")
    page.get_by_label("Number of draws").fill("500")
    page.get_by_role("button", name="Judge with tolerances").click()
    expect(page.locator("#tolerance-figures")).to_be_visible()


def test_an_image_is_judged(page: Page, tmp_path: Path) -> None:
    file = tmp_path / "beam.tif"
    file.write_bytes(as_file(gaussian(2.0, 1.0, 0.3), "TIFF"))
    page.goto("/profile")
    page.get_by_label("Camera image").set_input_files(file)
    page.get_by_label("Pixel size").fill("10")
    page.get_by_role("button", name="Judge the image").click()
    expect(page.locator("#moments")).to_contain_text("1.99")
    page.goto("/partial-source")
    page.get_by_label("x, y and diameter [mm], one emitter a line").fill("0 0 0.1 repeat 5 1 0")
    page.get_by_role("button", name="Find the worst part").click()
    expect(page.locator("#parts")).to_contain_text("Worst part")
    _check(page, 1280)


def _check(page: Page, width: int, rules: bool = True) -> None:
    """No sideways scroll, and no rule of accessibility broken."""
    assert page.evaluate("document.documentElement.scrollWidth") <= width, page.url
    if not rules:
        return
    found = AXE.run(page).response["violations"]
    assert [(v["id"], [n["target"] for n in v["nodes"]]) for v in found] == [], page.url


@pytest.mark.parametrize(("scheme", "width"), [("light", 1280), ("dark", 320)])
def test_pages_are_accessible_and_fit(browser: Browser, address: str, scheme: str, width: int) -> None:
    context = browser.new_context(
        viewport={"width": width, "height": 800},
        color_scheme=scheme,
        base_url=address,  # type: ignore[arg-type]
    )
    page = context.new_page()
    for path in ("/before-first-light", "/measured", "/tolerance"):
        page.goto(path)
        # The blank form stands in the answered page again.
        _check(page, width, rules=scheme == "light")
        example = page.locator(".answer li a").first.get_attribute("href") or ""
        page.goto(example)
        _check(page, width)
    page.goto(f"{page.url}&t.lines.0.emission.power_w=10%20%25&draws=500")
    _check(page, width)
    for path in ("/profile", "/partial-source", "/gain-media", "/before-first-light?v=1&levels=2"):
        page.goto(path)
        _check(page, width, rules=scheme == "light" or path == "/gain-media")
    context.close()
