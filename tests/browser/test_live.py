"""The answer refreshes while somebody types: focus, place, address and history are kept."""

from __future__ import annotations

import re

from playwright.sync_api import Browser, Page, expect

GREEN = {"Wavelength": "532", "Power": "0.1", "Beam diameter": "2", "Divergence, full angle": "1"}


def start(page: Page) -> None:
    for label, text in GREEN.items():
        page.get_by_label(label, exact=True).fill(text)
    expect(page.locator("#hazard-distance td").first).to_have_text("99.8 m")


def test_results_refresh_as_one_types(page: Page) -> None:
    """Ten times the power: the distance by the closed form of a Gaussian beam, 316.2 m, shown as 317 m.

    z = sqrt(a^2 / -ln(1 - 1/S) - d0^2) / phi with S = P / (E pi a^2 / 4) for the whole beam, a = 7 mm,
    d0 = 2 / sqrt 2 mm, phi = 1 / sqrt 2 mrad, E = 18 x 0.25^-0.25 W/m2 (ICNIRP 2013, from memory).
    """
    start(page)
    page.get_by_label("Power", exact=True).fill("1")
    expect(page.locator("#hazard-distance td").first).to_have_text("317 m")
    expect(page.locator("#said")).to_contain_text("unsafe out to 317 m")
    assert "power_w-1=1&" in page.url
    shown = page.url
    page.goto(shown)
    expect(page.locator("#hazard-distance td").first).to_have_text("317 m")
    assert page.get_by_label("Power", exact=True).input_value() == "1"


def test_focus_and_place_are_kept(browser: Browser, address: str) -> None:
    for width in (1280, 360):
        context = browser.new_context(viewport={"width": width, "height": 700}, base_url=address)
        page = context.new_page()
        page.goto("/")
        page.get_by_role("link", name="Green alignment beam").click()
        power = page.get_by_label("Power", exact=True)
        power.focus()
        power.press("End")
        before = power.evaluate("e => e.getBoundingClientRect().top")
        page.keyboard.type("0")
        expect(page.locator("#power_w-1-echo")).to_have_text("= 0.05 W")
        expect(page.locator("#answer")).not_to_have_attribute("aria-busy", "true")
        assert page.evaluate("document.activeElement.id") == "power_w-1"
        assert power.evaluate("e => e.selectionStart") == 2
        assert abs(power.evaluate("e => e.getBoundingClientRect().top") - before) < 2
        context.close()


def test_back_leads_to_the_page_before_the_typing(page: Page) -> None:
    page.get_by_role("link", name="Green alignment beam").click()
    loaded = page.url
    page.get_by_label("Power", exact=True).fill("50")
    expect(page).to_have_url(re.compile("power_w-1=50&"))
    page.get_by_label("Power", exact=True).fill("500")
    expect(page).to_have_url(re.compile("power_w-1=500&"))
    page.go_back()
    expect(page).to_have_url(loaded)
    expect(page.get_by_label("Power", exact=True)).to_have_value("5")
    expect(page.locator("#hazard-distance td").first).to_have_text("21.2 m")
    page.go_back()
    expect(page.get_by_role("heading", name="Evaluate a laser")).to_be_visible()
    page.go_forward()
    page.go_forward()
    expect(page.get_by_label("Power", exact=True)).to_have_value("500")


def test_no_old_figure_stands_beside_a_mistake(page: Page) -> None:
    start(page)
    page.get_by_label("Wavelength", exact=True).fill("1,064")
    expect(page.locator("#wavelength_nm-1-error")).to_contain_text("1.064 or 1064")
    expect(page.locator("#hazard-distance")).to_have_count(0)
    expect(page.locator("#answer")).to_contain_text("Nothing was computed")
    page.get_by_label("Wavelength", exact=True).fill("532")
    expect(page.locator("#hazard-distance td").first).to_have_text("99.8 m")
    expect(page.locator("#wavelength_nm-1-error")).to_have_count(0)


def test_a_service_that_does_not_answer_leaves_no_figure(browser: Browser, address: str) -> None:
    context = browser.new_context(base_url=address)
    page = context.new_page()
    page.goto("/")
    start(page)
    page.route("**/live?*", lambda route: route.abort())
    page.get_by_label("Power", exact=True).fill("2")
    expect(page.locator("#said")).to_contain_text("could not be refreshed")
    expect(page.locator("#hazard-distance")).to_have_count(0)
    context.close()


def test_values_of_another_emission_are_not_sent(page: Page) -> None:
    start(page)
    page.get_by_label("single pulse").check()
    expect(page.locator("#answer")).to_contain_text("Still needed")
    page.get_by_label("Energy of one pulse", exact=True).fill("1e-3")
    page.get_by_label("Pulse duration", exact=True).fill("1e-8")
    expect(page.locator("#hazard-distance")).to_be_visible()
    assert "power_w" not in page.url
    page.get_by_role("button", name="Evaluate").click()
    expect(page.locator("#hazard-distance")).to_be_visible()


def test_a_unit_changes_the_answer_and_is_told(page: Page) -> None:
    start(page)
    page.get_by_label("Unit of power", exact=True).select_option("mW")
    expect(page.locator("#power_w-1-echo")).to_have_text("= 0.0001 W")
    expect(page.locator("#hazard-distance td").first).not_to_have_text("99.8 m")
    page.get_by_label("Power", exact=True).fill("100")
    expect(page.locator("#hazard-distance td").first).to_have_text("99.8 m")


def test_a_duration_in_words(page: Page) -> None:
    start(page)
    page.get_by_label("a deliberate look while aligning (German practice), 2 s").check()
    expect(page.locator("#verdict-title + .verdict")).to_contain_text("a deliberate look while aligning")
    expect(page.get_by_label("Exposure duration", exact=True)).to_be_hidden()
    page.get_by_label("another duration").check()
    page.get_by_label("Exposure duration", exact=True).fill("7")
    expect(page.locator("#verdict-title + .verdict")).to_contain_text("for 7 s")


def test_lines_and_elements_land_in_view(page: Page) -> None:
    start(page)
    page.get_by_role("button", name="Copy this line").click()
    second = page.get_by_role("group", name="Emission line 2")
    expect(second).to_be_in_viewport()
    assert second.get_by_label("Power", exact=True).input_value() == "0.1"
    page.get_by_role("button", name="Add lens").click()
    page.get_by_role("button", name="Add free space").click()
    page.get_by_label("Focal length", exact=True).fill("100")
    page.get_by_label("Length", exact=True).fill("2")
    page.get_by_role("button", name="Move element 2 up").click()
    expect(page.get_by_role("group", name="1: Free space")).to_be_in_viewport()
    page.get_by_role("button", name="Remove element 1").click()
    expect(page.get_by_role("group", name="1: Lens")).to_be_visible()
    page.get_by_role("button", name="Evaluate").click()
    expect(page.get_by_text("comes to a focus").first).to_be_visible()


def test_everything_works_without_scripts(browser: Browser, address: str) -> None:
    context = browser.new_context(java_script_enabled=False, base_url=address)
    page = context.new_page()
    page.goto("/")
    for label, text in GREEN.items():
        page.get_by_label(label, exact=True).fill(text)
    page.get_by_role("button", name="Add lens").click()
    page.get_by_label("Focal length", exact=True).fill("5")
    page.get_by_label("Unit of focal length", exact=True).select_option("cm")
    page.get_by_role("button", name="Copy this line").click()
    page.get_by_role("button", name="Remove line 1").click()
    page.get_by_label("a fixed gaze limited by eye movement (US practice), 10 s").check()
    page.get_by_role("button", name="Evaluate").click()
    expect(page.get_by_role("heading", name="Result")).to_be_visible()
    expect(page.locator("#bench_focal_mm-1-echo")).to_have_text("= 50 mm")
    assert "exposure_s=10" in page.url
    page.go_back()
    expect(page.get_by_role("heading", name="Result")).to_have_count(0)
    context.close()
