"""Charts, sweeps and the report as their reader meets them: pointer, keyboard, dark, narrow, paper."""

from __future__ import annotations

import io
import re

import httpx
import pdfplumber
import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, Page, expect

AXE = Axe()
BEAM = "v=1&{}lines=1&wavelength_nm-1=532&mode-1=cw&power_w-1=0.1&diameter_mm-1=2&divergence_mrad-1=1"
LASER = BEAM.format("label=Trial&exposure_s=0.25&distance_m=20&")
EVALUATED = f"/evaluate?{LASER}"
READ = re.compile(r"([\d.]+) m: eye ([\d.]+) times, skin (.+) times the limit")


def read_out(page: Page) -> tuple[float, float]:
    """Distance and ratio of the eye as the chart says them."""
    match = READ.fullmatch(page.locator("figure.chart output").inner_text())
    assert match
    return float(match[1]), float(match[2])


def ratio_at(address: str, distance_m: float) -> float:
    line = {
        "wavelength_nm": 532,
        "emission": {"mode": "cw", "power_w": 0.1},
        "beam": {"diameter_mm": 2, "divergence_mrad": 1},
    }
    body = {"exposure_s": 0.25, "lines": [line], "viewing": {"distance_m": distance_m}}
    answer = httpx.post(f"{address}/api/v1/evaluate", json=body).json()
    return float(answer["eye"]["at_distance"]["hazard_ratio"])


def test_chart_is_read_with_the_pointer(page: Page, address: str) -> None:
    page.goto(EVALUATED)
    plot = page.locator("figure.chart svg")
    plot.scroll_into_view_if_needed()
    box = plot.bounding_box()
    assert box
    found = []
    for part in (0.3, 0.6, 0.9):
        page.mouse.move(box["x"] + part * box["width"], box["y"] + 0.5 * box["height"])
        found.append(read_out(page))
        exact = ratio_at(address, found[-1][0])
        assert exact * (1 - 1e-9) <= found[-1][1] <= exact * 1.0101
    assert [z for z, _ in found] == sorted(z for z, _ in found)
    assert found[0][1] > 1.0 > found[2][1]
    expect(page.locator("figure.chart .cursor")).to_be_visible()


def test_chart_is_read_with_the_keyboard(page: Page) -> None:
    page.goto(EVALUATED)
    slider = page.get_by_role("slider", name="Read the chart at a distance")
    slider.focus()
    first = read_out(page)
    page.keyboard.press("ArrowRight")
    second = read_out(page)
    assert second[0] > first[0]
    assert slider.get_attribute("aria-valuetext") == page.locator("figure.chart output").inner_text()
    page.keyboard.press("Home")
    assert read_out(page)[0] == 0.1
    page.keyboard.press("End")
    assert read_out(page)[0] == 1000.0


def test_chart_keeps_working_when_the_answer_is_replaced(page: Page) -> None:
    page.goto(EVALUATED)
    page.evaluate("const a = document.querySelector('.answer'); const t = a.innerHTML; a.innerHTML = t;")
    page.get_by_role("slider", name="Read the chart at a distance").focus()
    assert read_out(page)[1] > 0.0


def test_chart_without_script_has_its_table(browser: Browser, address: str) -> None:
    context = browser.new_context(java_script_enabled=False, base_url=address)
    page = context.new_page()
    page.goto(EVALUATED)
    expect(page.get_by_role("img", name="Exposure over limit against distance")).to_be_visible()
    expect(page.get_by_role("slider")).to_have_count(0)
    page.get_by_text("The chart as a table").click()
    expect(page.locator(".chart-data tr.chosen th")).to_have_text("20 viewing")
    context.close()


def luminance(page: Page, selector: str, name: str) -> float:
    """Relative luminance of a colour of an element (WCAG 2.2, relative luminance)."""
    text = page.locator(selector).first.evaluate(f"e => getComputedStyle(e).{name}")
    channels = [float(c) / 255 for c in re.findall(r"[\d.]+", text)[:3]]
    r, g, b = (c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels)
    return 0.2126 * r + 0.7152 * g + 0.0722 * b


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_lines_and_words_stand_out_from_the_paper(browser: Browser, address: str, scheme: str) -> None:
    """Words at least 4.5 to 1, lines at least 3 to 1 (WCAG 2.2, 1.4.3 and 1.4.11)."""
    context = browser.new_context(color_scheme=scheme, base_url=address)  # type: ignore[arg-type]
    page = context.new_page()
    page.goto(EVALUATED)
    paper = luminance(page, "body", "backgroundColor")
    wanted = [
        (".plot .ticks", "fill", 4.5),
        (".plot .axis", "fill", 4.5),
        (".plot .curve-name.eye", "fill", 4.5),
        (".plot .curve-name.skin", "fill", 4.5),
        (".plot .limit-name", "fill", 4.5),
        (".plot .lane-name", "fill", 4.5),
        (".plot .curve.eye", "stroke", 3.0),
        (".plot .curve.skin", "stroke", 3.0),
        (".plot .limit", "stroke", 3.0),
        (".plot .mark path", "stroke", 3.0),
    ]
    for selector, name, least in wanted:
        own = luminance(page, selector, name)
        ratio = (max(own, paper) + 0.05) / (min(own, paper) + 0.05)
        assert ratio >= least, (selector, ratio)
    dashes = page.locator(".plot .curve.skin").evaluate("e => getComputedStyle(e).strokeDasharray")
    assert dashes != "none"
    context.close()


@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("width", [320, 1280])
def test_sweeps_are_accessible_and_fit(browser: Browser, address: str, scheme: str, width: int) -> None:
    context = browser.new_context(
        viewport={"width": width, "height": 800},
        color_scheme=scheme,
        base_url=address,  # type: ignore[arg-type]
    )
    page = context.new_page()
    paths = ["/sweep", f"/sweep?{LASER}", f"/sweep?{LASER}&sweep-field=wavelength_nm"]
    paths += [f"/sweep?{LASER}&sweep-start=1%2C064", EVALUATED]
    for path in paths:
        page.goto(path)
        found = AXE.run(page).response["violations"]
        assert [(v["id"], [n["target"] for n in v["nodes"]]) for v in found] == [], path
        assert page.evaluate("document.documentElement.scrollWidth") <= width, path
    context.close()


def test_words_of_a_narrow_chart_can_be_read_and_do_not_collide(browser: Browser, address: str) -> None:
    context = browser.new_context(viewport={"width": 320, "height": 800}, base_url=address)
    page = context.new_page()
    page.goto(EVALUATED)
    boxes = page.locator(".plot .ticks text").evaluate_all(
        "all => all.map(e => e.getBoundingClientRect().toJSON())"
    )
    assert min(b["height"] for b in boxes) >= 9.0
    for k, a in enumerate(boxes):
        for b in boxes[k + 1 :]:
            apart = a["right"] <= b["left"] or b["right"] <= a["left"]
            assert apart or a["bottom"] <= b["top"] + 2 or b["bottom"] <= a["top"] + 2, (a, b)
    context.close()


def test_from_the_answer_to_a_sweep_and_back(page: Page) -> None:
    page.goto(EVALUATED)
    page.get_by_role("link", name="See how the answer changes with one input").click()
    expect(page.get_by_role("heading", level=1)).to_have_text("Power runs: Trial")
    page.get_by_role("navigation", name="Inputs that may run").get_by_role("link", name="Wavelength").click()
    expect(page.get_by_role("heading", level=1)).to_have_text("Wavelength runs: Trial")
    page.get_by_label("First value").fill("400")
    page.get_by_label("Last value").fill("700")
    page.get_by_label("in even steps").check()
    page.get_by_role("button", name="Sweep").click()
    assert "sweep-start=400&sweep-stop=700" in page.url
    expect(page.locator("#sweep-rows tbody tr").first.locator("th")).to_have_text("400")
    slider = page.get_by_role("slider").first
    slider.focus()
    page.keyboard.press("End")
    expect(page.locator("figure.chart output").first).to_contain_text("700 nm: eye 99.8 m, skin none")
    with page.expect_download() as download:
        page.get_by_role("link", name="Every value as CSV").click()
    assert download.value.suggested_filename == "sweep-wavelength_nm.csv"
    page.get_by_role("link", name="Back to the evaluation").click()
    expect(page.locator("#hazard-distance td").first).to_have_text("99.8 m")


def test_report_opens_from_the_answer(page: Page, address: str) -> None:
    page.goto(EVALUATED)
    link = page.get_by_role("link", name="report, A4").get_attribute("href")
    answer = httpx.get(f"{address}{link}", follow_redirects=True)
    assert answer.headers["content-type"] == "application/pdf"
    with pdfplumber.open(io.BytesIO(answer.content)) as opened:
        first = opened.pages[0].extract_text()
    assert "Above the limit out to 99.8 m" in first


def test_chart_prints(page: Page) -> None:
    page.goto(EVALUATED)
    page.get_by_role("slider").focus()
    page.emulate_media(media="print")
    expect(page.get_by_role("img", name="Exposure over limit against distance")).to_be_visible()
    expect(page.locator(".chart-reader")).to_be_hidden()
    expect(page.locator(".plot .cursor")).to_be_hidden()
