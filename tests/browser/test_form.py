"""The form as its user fills it: by labels, with the keyboard, without scripts."""

from __future__ import annotations

import json
from decimal import ROUND_CEILING, Context, Decimal

import httpx
import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, Page, expect

AXE = Axe()
BEAM = {"Beam diameter": "2", "Divergence, full angle": "1"}


def fill(page: Page, values: dict[str, str]) -> None:
    for label, text in values.items():
        page.get_by_label(label, exact=True).fill(text)


def distance(page: Page) -> str:
    return page.locator("#hazard-distance td").first.inner_text()


def up(value: float) -> str:
    """Three significant digits, rounded up (written out here, not taken from the service)."""
    return f"{Context(prec=3, rounding=ROUND_CEILING).create_decimal(Decimal(repr(value))):f}"


CASES = [
    ("continuous", {"Power": "0.1"}, {"mode": "cw", "power_w": 0.1}, 532),
    (
        "single pulse",
        {"Energy of one pulse": "0.05", "Pulse duration": "8e-9"},
        {"mode": "pulse", "energy_j": 0.05, "pulse_s": 8e-9},
        1064,
    ),
    (
        "pulse train",
        {"Average power": "0,02", "Pulse duration": "1e-7", "Repetition rate": "5000"},
        {"mode": "train", "average_power_w": 0.02, "pulse_s": 1e-7, "rate_hz": 5000},
        905,
    ),
]


@pytest.mark.parametrize(("kind", "values", "emission", "wavelength"), CASES, ids=[c[0] for c in CASES])
def test_fill_by_labels_and_compare_with_json(
    page: Page, address: str, kind: str, values: dict[str, str], emission: dict[str, object], wavelength: int
) -> None:
    page.get_by_label(kind).check()
    fill(page, {"Wavelength": str(wavelength), **values, **BEAM})
    page.get_by_role("button", name="Evaluate").click()
    line = {
        "wavelength_nm": wavelength,
        "emission": emission,
        "beam": {"diameter_mm": 2, "divergence_mrad": 1},
    }
    answer = httpx.post(f"{address}/api/v1/evaluate", json={"lines": [line]}).json()
    assert distance(page) == f"{up(answer['eye']['hazard_distance_m'])} m"
    assert page.locator("#optical-density td").first.inner_text() == up(answer["eye"]["optical_density"])
    expect(page.get_by_role("heading", name="Caution")).to_be_visible()
    # The address reproduces the page.
    shown = distance(page)
    page.goto(page.url)
    assert distance(page) == shown
    assert json.loads(page.locator("pre").text_content() or "{}")["lines"][0]["emission"] == emission


def test_only_the_fields_of_the_chosen_emission_show(page: Page) -> None:
    expect(page.get_by_label("Power", exact=True)).to_be_visible()
    expect(page.get_by_label("Repetition rate", exact=True)).to_be_hidden()
    page.get_by_label("pulse train").check()
    expect(page.get_by_label("Power", exact=True)).to_be_hidden()
    expect(page.get_by_label("Repetition rate", exact=True)).to_be_visible()


def test_error_summary_leads_to_the_field(page: Page) -> None:
    fill(page, {"Wavelength": "1,064", "Power": "0.1", **BEAM})
    page.get_by_role("button", name="Evaluate").click()
    alert = page.get_by_role("alert")
    expect(alert).to_contain_text("1,064 can mean 1.064 or 1064")
    alert.get_by_role("link", name="Wavelength").click()
    assert page.evaluate("location.hash") == "#wavelength_nm-1"
    field = page.get_by_label("Wavelength", exact=True)
    assert field.get_attribute("aria-invalid") == "true"
    assert field.input_value() == "1,064"
    field.fill("1064,5")
    page.get_by_role("button", name="Evaluate").click()
    expect(page.get_by_role("heading", name="Result")).to_be_visible()
    assert page.get_by_label("Wavelength", exact=True).input_value() == "1064.5"


def test_lines_are_added_and_removed(page: Page) -> None:
    fill(page, {"Wavelength": "532", "Power": "0.1", **BEAM})
    page.get_by_role("button", name="Add an emission line").click()
    expect(page.get_by_role("alert")).to_have_count(0)
    second = page.get_by_role("group", name="Emission line 2")
    second.get_by_label("Wavelength", exact=True).fill("1064")
    second.get_by_label("Power", exact=True).fill("0.5")
    second.get_by_label("Beam diameter", exact=True).fill("2")
    second.get_by_label("Divergence, full angle", exact=True).fill("1")
    page.get_by_role("button", name="Evaluate").click()
    expect(page.locator("#criteria-eye tr.sum")).to_contain_text("1 + 2")
    page.get_by_role("button", name="Remove line 2").click()
    page.get_by_role("button", name="Evaluate").click()
    assert distance(page) == "99.8 m"
    page.go_back()
    expect(page.get_by_role("heading", name="Evaluate a laser")).to_be_visible()


def test_goggles_that_cover_two_of_three_lines(page: Page) -> None:
    """A pumped green head: 808, 1064 and 532 nm in one housing; the page names the open line."""
    lines = [("808", "2", "5", "20"), ("1064", "0.5", "1", "2"), ("532", "0.2", "1", "2")]
    for k, (wavelength, power, diameter, divergence) in enumerate(lines, start=1):
        if k > 1:
            page.get_by_role("button", name="Add an emission line").click()
        part = page.get_by_role("group", name=f"Emission line {k}" if k > 1 else "What it emits")
        part.get_by_label("Wavelength", exact=True).fill(wavelength)
        part.get_by_label("Power", exact=True).fill(power)
        part.get_by_label("Beam diameter", exact=True).fill(diameter)
        part.get_by_label("Divergence, full angle", exact=True).fill(divergence)
    page.get_by_role("button", name="Add a pair of eyewear").click()
    fill(page, {"Name of the pair": "Goggles 7", "Ranges": "780-1100: OD 7 | D LB6 + IR LB7"})
    page.get_by_label("Shelf 2: green and near infrared").check()
    page.get_by_role("button", name="Evaluate").click()
    two, three = (
        page.locator(".pair").filter(has_text="Goggles 7"),
        page.locator(".pair").filter(has_text="Shelf 2"),
    )
    expect(two.get_by_role("heading")).to_have_text("Goggles 7: not sufficient")
    expect(two).to_contain_text("532 nm (line 3): open.")
    expect(two).to_contain_text("808 nm (line 1): covered strongly enough.")
    expect(three.get_by_role("heading")).to_contain_text(": sufficient")
    expect(page.locator(".pair").first).to_contain_text("Shelf 2")
    expect(page.locator(".class-name").first).to_have_text("4")
    assert "1064 nm is not covered" not in two.inner_text()


def test_ranges_that_cannot_be_read_lead_back_to_their_field(page: Page) -> None:
    fill(page, {"Wavelength": "532", "Power": "0.1", **BEAM})
    page.get_by_role("button", name="Add a pair of eyewear").click()
    fill(page, {"Ranges": "520-540: D L5"})
    page.get_by_role("button", name="Evaluate").click()
    page.get_by_role("alert").get_by_role("link", name="Ranges (pair 1)").click()
    assert page.evaluate("location.hash") == "#pair_ranges-1"
    expect(page.get_by_label("Ranges", exact=True)).to_have_attribute("aria-invalid", "true")


def test_keyboard_alone(page: Page) -> None:
    """From the first field to the answer with Tab, typing and Enter."""
    page.get_by_label("Wavelength", exact=True).focus()
    # Wavelength and unit, emission, power and unit, kind of beam, diameter and unit, divergence.
    tab = "Tab"
    for keys in ("532", tab, tab, tab, "0.1", tab, tab, tab, "2", tab, tab, "1"):
        if keys == "Tab":
            page.keyboard.press("Tab")
        else:
            page.keyboard.type(keys)
    page.keyboard.press("Enter")
    assert distance(page) == "99.8 m"


def test_without_scripts(browser: Browser, address: str) -> None:
    context = browser.new_context(java_script_enabled=False, base_url=address)
    page = context.new_page()
    page.goto("/")
    page.get_by_role("link", name="Infrared Q-switched").click()
    expect(page.get_by_text("Looking into the beam is unsafe out to")).to_be_visible()
    context.close()


def assert_accessible(page: Page, path: str) -> None:
    found = AXE.run(page).response["violations"]
    assert [(v["id"], [n["target"] for n in v["nodes"]]) for v in found] == [], path


@pytest.mark.parametrize(("scheme", "width"), [("light", 1280), ("dark", 320), ("light", 320)])
def test_pages_are_accessible_and_fit(browser: Browser, address: str, scheme: str, width: int) -> None:
    """No violation found by axe in either scheme, no sideways scroll of the page, on every kind of page."""
    context = browser.new_context(
        viewport={"width": width, "height": 800},
        color_scheme=scheme,  # type: ignore[arg-type]
        base_url=address,
    )
    page = context.new_page()
    page.goto("/")
    links = page.locator(".examples a").all()
    green, pulses, *others = (e.get_attribute("href") or "" for e in links)
    pair = "&pairs=1&windows=1&pair_ranges-1=500%3A%20RB2&window_distance_m-1=2&window_density-1=3"
    paths = ["/", f"{green}&shelf-near-infrared=1", pulses + pair, others[-2], others[-1]]
    paths += ["/rules", "/rules/eu-2006-25", "/classes", "/eyewear", "/classes/iec-60825-1-2014"]
    paths += ["/classes/us-21cfr1040", "/nowhere", "/evaluate?v=9", "/problems/not-found"]
    paths += ["/evaluate?v=1&lines=1&wavelength_nm-1=1%2C064"]
    paths += ["/evaluate?v=1&lines=1&elements=2&bench_kind-1=reflector&edit=1"]
    for path in paths + others:
        page.goto(path)
        assert page.evaluate("document.documentElement.scrollWidth") <= width, path
        if path in paths and (scheme, width) != ("light", 320):
            assert_accessible(page, path)
    page.goto("/")
    page.get_by_label("Wavelength", exact=True).fill("532")
    expect(page.get_by_role("heading", name="Not yet complete")).to_be_visible()
    assert_accessible(page, "half filled")
    context.close()


def test_print_carries_the_cautions(page: Page) -> None:
    page.get_by_role("link", name="Green alignment beam").click()
    page.emulate_media(media="print")
    expect(page.get_by_role("heading", name="Caution")).to_be_visible()
    expect(page.get_by_role("button", name="Evaluate")).to_be_hidden()
    assert page.pdf(format="A4")[:4] == b"%PDF"
