"""The register as the laser safety officer uses it for a day, with the keyboard's labels, without scripts."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, Page, expect

AXE = Axe()
HEAD = "asset_tag,label,place,owner,wavelength_nm,mode,power_w,diameter_mm,divergence_mrad,review_due\n"
#: Invented lasers; 40 of them, every fourth with a review long past.
ROWS = "".join(
    f"BL-{n:03d},Laser {n},Building {n % 4},A. Example,{(405, 532, 633, 1064)[n % 4]},cw,"
    f"{0.0005 * 2 ** (n % 12)},2,1,{'2020-01-31' if n % 4 == 0 else '2099-01-31'}\n"
    for n in range(40)
)


@pytest.fixture(scope="module")
def register(tmp_path_factory: pytest.TempPathFactory) -> Iterator[str]:
    """Address of a service with an empty register of its own."""
    folder = tmp_path_factory.mktemp("register")
    command = [sys.executable, "-m", "service.cli", "serve", "--port", "0"]
    environment = {**os.environ, "BLINKLINE_DATA_DIR": str(folder)}
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True, env=environment) as process:
        assert process.stdout is not None
        yield process.stdout.readline().rpartition(" ")[2].strip()
        process.terminate()


@pytest.fixture
def desk(browser: Browser, register: str) -> Iterator[Page]:
    """A page without scripts; the test fails on any error in the console but a refused form."""
    context = browser.new_context(base_url=register, java_script_enabled=False)
    page = context.new_page()
    errors: list[str] = []
    page.on("console", lambda m: errors.append(m.text) if m.type == "error" else None)
    yield page
    context.close()
    assert [e for e in errors if "status of 422" not in e] == []


def test_the_day_of_the_laser_safety_officer(desk: Page, tmp_path: Path) -> None:
    desk.goto("/")
    desk.get_by_role("link", name="Register").click()
    expect(desk.get_by_role("heading", name="The register is empty")).to_be_visible()
    desk.get_by_role("link", name="import a CSV file").click()

    # A file with an error: nothing is stored, the row is named.
    wrong, right = tmp_path / "wrong.csv", tmp_path / "right.csv"
    wrong.write_text(HEAD + ROWS.replace("BL-003,Laser 3,Building 3,A. Example,1064", "BL-003,,,,1.064um"))
    right.write_text(HEAD + ROWS)
    desk.get_by_label("CSV file").set_input_files(wrong)
    desk.get_by_role("button", name="Import", exact=True).click()
    expect(desk.get_by_role("alert")).to_contain_text("row 5, wavelength_nm")
    desk.get_by_label("CSV file").set_input_files(right)
    desk.get_by_role("button", name="Import", exact=True).click()
    expect(desk.get_by_role("status")).to_contain_text("created 40")

    # Open one, look at its evaluation, change the power there, save it as a revision.
    desk.get_by_role("link", name="Open the register").click()
    desk.get_by_label("Search").fill("BL-001")
    desk.get_by_role("button", name="Show").click()
    desk.get_by_role("link", name="BL-001").click()
    desk.get_by_role("link", name="Open the evaluation").click()
    expect(desk.get_by_role("heading", name="Result", exact=True)).to_be_visible()
    desk.get_by_label("Power", exact=True).fill("0.1")
    desk.get_by_role("button", name="Evaluate").click()
    distance = desk.locator("#hazard-distance td").first.inner_text()
    desk.get_by_role("link", name="Save to the register").click()
    desk.get_by_label("Reason of the change").fill("Measured with the new head")
    desk.get_by_role("button", name="Save as a revision of BL-001").click()
    expect(desk.get_by_role("status")).to_contain_text("The change is stored")
    expect(desk.get_by_role("cell", name=distance).first).to_be_visible()

    # Eyewear on the shelf, submit, return, submit, approve with the next review.
    desk.get_by_role("link", name="Eyewear shelf").click()
    desk.get_by_role("link", name="Put a pair on the shelf").click()
    for label, text in {
        "Tag": "EW-1",
        "Name": "Green",
        "Markings by wavelength": "515-540: OD 6 | D LB6 + IR LB6",
        "Place": "Cabinet 2",
    }.items():
        desk.get_by_label(label).fill(text)
    desk.get_by_role("button", name="Put it on the shelf").click()
    desk.get_by_role("link", name="BL-001").click()
    expect(desk.get_by_role("region", name="Pairs on the shelf")).to_contain_text("will do")
    desk.get_by_role("button", name="Submit for approval").click()
    desk.get_by_label("Comment").fill("Name the head")
    desk.get_by_role("button", name="Return").click()
    expect(desk.get_by_text("returned", exact=True).first).to_be_visible()
    desk.get_by_role("button", name="Submit for approval").click()
    desk.get_by_label("Next review").first.fill("2099-06-01")
    desk.get_by_role("button", name="Approve").click()
    expect(desk.get_by_role("status")).to_contain_text("in force and locked")

    # Sign and report of the revision in force: the file at once, or how it looks chosen first.
    for name in ("Sign", "Report, A4", "Report, Letter"):
        href = desk.get_by_role("link", name=name, exact=True).get_attribute("href")
        assert href is not None
        made = desk.request.get(href)
        assert made.ok, made.text()
        assert made.headers["content-type"] == "application/pdf"
        assert made.headers["blinkline-revision"] == "2; approved"
        assert made.body().startswith(b"%PDF-")
    laser = desk.url
    desk.get_by_role("link", name="Choose how the sign looks").click()
    expect(desk.get_by_label("Room", exact=True)).to_have_value("Building 1")
    expect(desk.get_by_role("link", name="PDF", exact=True).first).to_be_visible()
    desk.goto(laser)

    # What differs, and the overdue list.
    desk.get_by_role("link", name="Revision 2").click()
    row = desk.get_by_role("row", name="line 1 emission power_w")
    expect(row).to_contain_text("0.001")
    expect(row).to_contain_text("0.1")
    desk.get_by_role("link", name="Overview").click()
    expect(desk.get_by_role("link", name="10 review overdue")).to_be_visible()
    desk.get_by_role("link", name="10 review overdue").click()
    expect(desk.get_by_text("10 lasers found")).to_be_visible()
    desk.get_by_label("Select BL-000").check()
    desk.get_by_label("Next review").fill("2099-01-01")
    desk.get_by_role("button", name="Set").click()
    expect(desk.get_by_role("status")).to_contain_text("BL-000")
    desk.goto("/lasers?overdue=true")
    expect(desk.get_by_text("9 lasers found")).to_be_visible()

    # Under the same tables nothing would change.
    desk.get_by_role("link", name="Re-evaluation").click()
    desk.get_by_role("button", name="Evaluate 40 lasers anew").click()
    desk.wait_for_timeout(500)
    desk.goto(desk.url)
    expect(desk.get_by_text("No laser would change")).to_be_visible()

    # Everything of this day stands in the log.
    desk.get_by_role("link", name="Audit log").click()
    for action in ("lasers imported", "revision added", "revision returned", "revision approved"):
        expect(desk.get_by_role("main")).to_contain_text(action)


@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("width", [1280, 320])
def test_pages_are_accessible(browser: Browser, register: str, scheme: str, width: int) -> None:
    context = browser.new_context(
        base_url=register, color_scheme=scheme, viewport={"width": width, "height": 800}
    )
    page = context.new_page()
    paths = ["/lasers", "/lasers/1", "/lasers/2", "/lasers/2/edit", "/lasers/2/revisions/2", "/lasers/import"]
    paths += [
        "/overview",
        "/shelf",
        "/shelf/new",
        "/shelf/1",
        "/reevaluations",
        "/audit",
        "/users",
        "/account",
    ]
    paths += ["/account", "/reevaluations/1", "/lasers?status=retired", "/lasers/999"]
    for path in paths:
        page.goto(path)
        found = AXE.run(page).response["violations"]
        assert [(v["id"], [n["target"] for n in v["nodes"]]) for v in found] == [], path
        assert page.evaluate("document.documentElement.scrollWidth") <= width, path
    context.close()
