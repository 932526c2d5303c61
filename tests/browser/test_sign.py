"""The page of a sign as its user sees it: live preview, without scripts, accessible, printed in true size."""

from __future__ import annotations

import io
from pathlib import Path
from urllib.parse import quote, urlencode

import httpx
import pdfplumber
import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, Page, expect

from tests.web.pages import CW

AXE = Axe()
MM = 72.0 / 25.4


def sign(path: str = "/sign", **more: str) -> str:
    given = {"v": "1", **CW, **({f"sign-{k}": v for k, v in {"v": "1", **more}.items()} if more else {})}
    return f"{path}?{urlencode(given, quote_via=quote)}"


def preview_loaded(page: Page) -> bool:
    script = (
        "() => { const i = document.querySelector('.preview img'); return i.complete && i.naturalWidth > 0; }"
    )
    page.wait_for_function(script)
    return True


def test_from_the_evaluation_to_the_sign(page: Page) -> None:
    page.goto(f"/evaluate?{urlencode({'v': '1', **CW}, quote_via=quote)}")
    page.get_by_role("link", name="sign for the door or label").click()
    expect(page.get_by_role("heading", level=1)).to_have_text("Sign for Bench 4 alignment beam")
    assert preview_loaded(page)


def test_the_preview_follows_the_form(page: Page) -> None:
    page.goto(sign())
    room = page.get_by_label("Room", exact=True)
    room.press_sequentially("Room 2.14")
    expect(page.locator("#sign-result")).to_contain_text("Room 2.14")
    # The field keeps its focus, and the address is that of the sheet shown.
    expect(room).to_be_focused()
    assert "sign-room=Room%202.14" in page.url
    page.get_by_label("Family").select_option("ansi")
    expect(page.locator("#sign-result")).to_contain_text("WARNING")
    page.get_by_label("Signal word").select_option("danger")
    expect(page.locator("#sign-result")).to_contain_text("DANGER")
    assert preview_loaded(page)
    page.reload()
    expect(page.locator("#sign-result")).to_contain_text("DANGER")
    expect(page.get_by_label("Room", exact=True)).to_have_value("Room 2.14")


def test_an_error_stands_where_the_sheet_was(page: Page) -> None:
    page.goto(sign())
    page.get_by_label("Kind").select_option("temporary")
    expect(page.locator("#sign-result")).to_contain_text("a temporary area needs its days")
    page.get_by_label("First day").fill("2026-12-01")
    page.get_by_label("Last day").fill("2026-12-05")
    expect(page.locator("#sign-result")).to_contain_text("2026-12-01 to 2026-12-05")
    expect(page.locator("#sign-result .summary")).to_have_count(0)


def test_without_scripts(browser: Browser, address: str) -> None:
    context = browser.new_context(java_script_enabled=False, base_url=address)
    page = context.new_page()
    page.goto(sign())
    page.get_by_label("Sheet", exact=True).select_option("A6")
    page.get_by_label("Second language").select_option("de")
    page.get_by_role("button", name="Show the sign").click()
    expect(page.locator("#sign-result")).to_contain_text("LASER KLASSE 3B")
    assert "sign-sheet=A6" in page.url
    context.close()


@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize(
    "url",
    [sign(), sign(kind="temporary"), sign("/sign/print", date="2026-12-01")],
    ids=["form", "error", "print"],
)
def test_axe_finds_nothing(browser: Browser, address: str, url: str, scheme: str) -> None:
    context = browser.new_context(color_scheme=scheme, base_url=address)  # type: ignore[arg-type]
    page = context.new_page()
    page.goto(url)
    found = AXE.run(page)
    assert found.violations_count == 0, found.generate_report()
    context.close()


@pytest.mark.parametrize("width", [320, 1280])
def test_nothing_runs_over_the_side(browser: Browser, address: str, width: int) -> None:
    context = browser.new_context(viewport={"width": width, "height": 900}, base_url=address)
    page = context.new_page()
    page.goto(sign(family="ansi", second="de"))
    assert page.evaluate("document.documentElement.scrollWidth") <= width
    context.close()


@pytest.mark.parametrize(
    ("sheet", "orientation"), [("A4", "portrait"), ("A5", "landscape"), ("Letter", "portrait")]
)
def test_the_print_view_prints_one_page_of_true_size(
    browser: Browser, address: str, tmp_path: Path, sheet: str, orientation: str
) -> None:
    sizes = {"A4": (210, 297), "A5": (210, 148), "Letter": (215.9, 279.4)}
    context = browser.new_context(base_url=address)
    page = context.new_page()
    page.goto(sign("/sign/print", sheet=sheet, orientation=orientation, date="2026-12-01"))
    page.wait_for_load_state("networkidle")
    document = page.pdf(prefer_css_page_size=True)
    with pdfplumber.open(io.BytesIO(document)) as opened:
        (printed,) = opened.pages
        size = (printed.width / MM, printed.height / MM)
    assert size == pytest.approx(sizes[sheet], abs=0.5)
    context.close()


def test_the_drawing_opens_on_its_own(page: Page, address: str) -> None:
    """As SVG under the strict policy; the page fixture fails on any complaint in the console."""
    url = sign("/sign/sheet.svg", date="2026-12-01")
    page.goto(url)
    assert page.locator("svg").first.bounding_box()
    assert httpx.get(address + url).headers["content-security-policy"].startswith("default-src 'none'")
