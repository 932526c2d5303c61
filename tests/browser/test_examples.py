"""Every starting example, entered by hand by the labels of the form, gives the figures of its link."""

from __future__ import annotations

import pytest
from playwright.sync_api import Page, expect

Step = tuple[str, ...]


def fill(label: str, text: str, unit: str = "") -> Step:
    return ("fill", label, text, unit)


def check(label: str) -> Step:
    return ("check", label)


def press(button: str) -> Step:
    return ("press", button)


def within(group: str) -> Step:
    return ("within", group)


def unfold(summary: str) -> Step:
    return ("unfold", summary)


def beam(diameter: str, divergence: str) -> list[Step]:
    return [fill("Beam diameter", diameter), fill("Divergence, full angle", divergence)]


def line(k: int, wavelength: str, power: str, *size: str) -> list[Step]:
    start = [press("Add an emission line")] if k > 1 else []
    name = f"Emission line {k}" if k > 1 else "What it emits"
    return [*start, within(name), fill("Wavelength", wavelength), fill("Power", power), *beam(*size)]


EXAMPLES: dict[str, list[Step]] = {
    "Green alignment beam": [fill("Wavelength", "532"), fill("Power", "5", "mW"), *beam("1.2", "1")],
    "Infrared Q-switched": [
        fill("Wavelength", "1064"),
        check("pulse train"),
        fill("Energy of one pulse", "50", "mJ"),
        fill("Repetition rate", "20"),
        fill("Pulse duration", "8", "ns"),
        *beam("6", "0.5"),
        check("Shelf 1: near infrared (invented)"),
    ],
    "Carbon dioxide cutter": [
        fill("Wavelength", "10.6", "µm"),
        fill("Power", "120"),
        *beam("7", "2"),
        fill("Viewing distance", "2"),
        press("Add a window"),
        fill("Distance of the window", "1.5"),
        fill("Its optical density", "6"),
    ],
    "Femtosecond oscillator": [
        fill("Wavelength", "800"),
        check("pulse train"),
        fill("Average power", "0.6"),
        fill("Repetition rate", "80", "MHz"),
        fill("Pulse duration", "100", "fs"),
        *beam("1.5", "1"),
        *line(2, "532", "0.2", "2", "0.8"),
    ],
    "Three lines in one housing": [
        *line(1, "808", "2", "5", "20"),
        *line(2, "1064", "0.5", "1", "2"),
        *line(3, "532", "0.2", "1", "2"),
    ],
    "Fibre-coupled diode": [
        fill("Wavelength", "976"),
        fill("Power", "8"),
        check("end of a multimode fibre"),
        fill("Numerical aperture", "0.22"),
        fill("Core diameter", "105"),
        unfold("Through binoculars or a loupe, or outdoors"),
        within("Who looks, and for how long"),
        fill("Magnification", "7"),
        fill("Diameter of the objective", "18"),
    ],
    "Green beam through a lens": [
        fill("Wavelength", "532"),
        fill("Power", "2"),
        *beam("2", "0.5"),
        press("Add lens"),
        fill("Focal length", "200"),
        press("Add free space"),
        fill("Length", "50", "cm"),
        press("Add flat reflector"),
        ("pick", "or material", "crown glass"),
        fill("Angle of incidence", "45"),
        check("both sides of a plate"),
    ],
    "White wall lit by a blue diode": [
        fill("Wavelength", "450"),
        fill("Power", "3"),
        *beam("3", "2"),
        press("Add free space"),
        fill("Length", "2"),
        press("Add diffuser"),
        fill("Reflectance", "80", "%"),
    ],
    "Show scanner outdoors": [
        fill("Wavelength", "532"),
        fill("Power", "5"),
        *beam("2", "1"),
        press("Add scanner"),
        fill("Full angle of the sweep", "30"),
        fill("Sweeps a second", "100"),
        unfold("Through binoculars or a loupe, or outdoors"),
        check("outdoors: tell how far it disturbs pilots"),
    ],
    "Diode pulse train": [
        fill("Wavelength", "905"),
        check("pulse train"),
        fill("Average power", "20", "mW"),
        fill("Repetition rate", "5", "kHz"),
        fill("Pulse duration", "100", "ns"),
        *beam("1", "12"),
        unfold("Elliptical, or with its waist elsewhere"),
        fill("Diameter, other axis", "4"),
        fill("Divergence, other axis", "3"),
        ("pick", "Judged by", "eu-2006-25"),
    ],
}


def do(page: Page, steps: list[Step]) -> None:
    form = page.locator("form.sheet")
    place = form
    for kind, what, *more in steps:
        if kind == "within":
            place = form.get_by_role("group", name=what)
        elif kind == "fill":
            place.get_by_label(what, exact=True).fill(more[0])
            if more[1]:
                place.get_by_label(f"Unit of {what.lower()}", exact=True).select_option(label=more[1])
        elif kind == "check":
            place.get_by_label(what, exact=True).check()
        elif kind == "pick":
            place.get_by_label(what, exact=True).select_option(more[0])
        elif kind == "unfold":
            form.get_by_text(what).click()
        else:
            form.get_by_role("button", name=what, exact=True).click()
            place = form


def figures(page: Page) -> list[str]:
    """Exact values of the distances: those of the answer to the values entered, not of an older one."""
    expect(page.locator("#figures-title")).to_be_visible()
    cells = page.locator("#hazard-distance, #hazard-ratio, #optical-density").locator("data")
    return [str(value) for value in cells.evaluate_all("all => all.map(d => d.value)")]


@pytest.mark.parametrize("name", EXAMPLES)
def test_entered_by_hand(page: Page, name: str) -> None:
    page.get_by_role("link", name=name).click()
    wanted = figures(page)
    page.goto("/")
    do(page, EXAMPLES[name])
    page.get_by_role("button", name="Evaluate").click()
    assert figures(page) == wanted


def test_every_example_of_the_page_is_entered(page: Page) -> None:
    links = page.locator(".examples a").all_inner_texts()
    assert len(links) == len(EXAMPLES)
    assert all(any(text.startswith(name) for name in EXAMPLES) for text in links)
