"""Every family, class, sheet and language renders on one page without overflow, and says what it must."""

from __future__ import annotations

import io
import math
import re
from itertools import product
from typing import Any

import pdfplumber
import pytest

from service.contract.problem import InvalidRequest
from tests.sign.lasers import CLASSES, LASERS, content, evaluation, result, sign
from tests.web.sign_pdf import CAPITAL, MM, assert_set_well, codes, read

SHEETS = ("A3", "A4", "A5", "A6", "Letter")
LANGUAGES = ("en", "de", "fr", "es", "it", "nl")
DOOR: dict[str, Any] = {
    "room": "Building 3, room 2.14",
    "lso_name": "A. Example",
    "lso_phone": "+00 123 4567",
    "address": "https://blinkline.example/evaluate?v=1&lines=1",
}
TEMPORARY = {"kind": "temporary", "valid_from": "2026-12-01", "valid_to": "2026-12-05"}


def set_and_read(hazard_class: str, **options: Any) -> Any:
    made = sign(hazard_class, **options)
    found = read(made.pdf())
    assert found.size == pytest.approx([s * MM for s in made.sheet.page], abs=0.01)
    letters = made.data["letters"]
    edge, (width, height) = made.sheet.margin, made.sheet.sign
    least, box = min(letters["details_least"], letters["fine"]), (width - 2 * edge, height - 2 * edge)
    inside = sum(assert_set_well(found, (x + edge, y + edge), box, least) for x, y in made.sheet.corners)
    assert inside == len(found.letters), "a letter lies outside every sign"
    return found, made


def plain(text: str) -> str:
    return re.sub(r"\s+", "", text.replace("\u00a0", ""))


def assert_says_everything(found: Any, made: Any) -> None:
    """Words and figures of the content stand in the PDF, letter by letter."""
    c, text = made.content, plain(found.text)
    said = [*c.signal_texts, *c.banner, *c.footer]
    said += [t for h in c.headlines for t in (h.radiation, h.sentence, h.hazard_class) if t]
    said += [t for n in c.notes for t in n.texts] + [t for r in c.rows for t in r.lines]
    for part in said:
        assert plain(part) in text, part


@pytest.mark.parametrize("sheet", SHEETS)
@pytest.mark.parametrize("family", ["iso", "ansi"])
def test_door_signs_in_every_class_and_language(family: str, sheet: str) -> None:
    for k, (hazard_class, language) in enumerate(product(CLASSES, LANGUAGES)):
        # Upright and wide in turn: seven classes and six languages meet both.
        orientation = ("portrait", "landscape")[(k + k // 6) % 2]
        options = {"family": family, "sheet": sheet, "languages": [language], "orientation": orientation}
        found, made = set_and_read(hazard_class, **DOOR, **options)
        assert_says_everything(found, made)


@pytest.mark.parametrize("family", ["iso", "ansi"])
@pytest.mark.parametrize("kind", ["label", "aperture"])
def test_labels_in_every_class_and_language(family: str, kind: str) -> None:
    sizes = ([100, 50], [74, 37], [105, 74], [148, 105], [60, 90])
    for k, (hazard_class, language) in enumerate(product(CLASSES, LANGUAGES)):
        size = sizes[k % len(sizes)]
        options = {"family": family, "kind": kind, "sheet": "own", "label_mm": size, "languages": [language]}
        found, made = set_and_read(hazard_class, **options)
        assert_says_everything(found, made)


@pytest.mark.parametrize("languages", [("de", "en"), ("fr", "nl"), ("es", "it")])
@pytest.mark.parametrize("orientation", ["portrait", "landscape"])
def test_two_languages_on_the_smallest_sheet(languages: tuple[str, str], orientation: str) -> None:
    """A6 is the smallest sheet; what fits there fits on all, which are like in shape and larger."""
    for family, hazard_class in product(("iso", "ansi"), ("2M", "3B", "4")):
        options = {"family": family, "sheet": "A6", "languages": list(languages), "orientation": orientation}
        found, made = set_and_read(hazard_class, **DOOR, **options)
        assert_says_everything(found, made)


@pytest.mark.parametrize("family", ["iso", "ansi"])
@pytest.mark.parametrize(("copies", "orientation"), [(2, "portrait"), (2, "landscape"), (4, "portrait")])
def test_several_signs_on_a_sheet(family: str, copies: int, orientation: str) -> None:
    found, made = set_and_read(
        "4", **DOOR, **TEMPORARY, family=family, copies=copies, orientation=orientation
    )
    assert_says_everything(found, made)
    assert plain(found.text).count(plain("CLASS 4 LASER PRODUCT")) == copies


def test_a_sheet_full_of_labels() -> None:
    made = sign("3R", kind="label", label_mm=[74, 37], copies=14)
    found = read(made.pdf())
    assert (found.pages, found.text.count("2026-12-01")) == (1, 14)


def test_figures_in_the_pdf_are_those_of_the_answer() -> None:
    """Every figure that the answer gives is printed, rounded to the safe side, and no other."""
    found, made = set_and_read("4", **DOOR)
    row_text = " ".join(
        t for r in made.content.rows if r.id in ("output", "eyewear", "distance") for t in r.lines
    )
    printed = re.findall(r"\d+(?:\.\d+)?", re.sub(r"LB\d+", "", row_text))
    accounted = [f.shown.split("\u00a0")[0] for f in made.content.figures]
    assert sorted(printed) == sorted(accounted)
    # By hand from the inputs: 0.35 J, 1.7 W / 10 Hz, 8 ns, 10 Hz, and the answer's distances.
    for text in ("350 mJ", "170 mJ", "8 ns", "10 Hz", "average 3.5 W", "average 1.7 W"):
        assert text in found.text
    far = result("4").eye.hazard_distance_m
    assert far is not None
    shown = re.search(r"eye: ([\d.]+) km", found.text)
    assert shown
    assert far <= float(shown[1]) * 1e3 < far * 1.01


@pytest.mark.parametrize("family", ["iso", "ansi"])
@pytest.mark.parametrize("sheet", ["A3", "A6"])
def test_stated_distances_hold_for_the_sizes_printed(family: str, sheet: str) -> None:
    """L <= sqrt(2000 A) of the triangle, L <= 300 x height of the smallest capitals of the warning."""
    made = sign("3B", **DOOR, family=family, sheet=sheet)
    document = made.pdf()
    text = read(document).text
    stated = re.search(r"Symbol recognisable up to ([\d.]+) m · Warning text readable up to ([\d.]+) m", text)
    assert stated
    with pdfplumber.open(io.BytesIO(document)) as opened:
        page = opened.pages[0]
        # The yellow triangle is the widest yellow shape that is no panel: its box gives the side.
        shapes = [c for c in page.curves if c["non_stroking_color"] not in (None, (0,), (0, 0, 0))]
        triangle = max((c for c in shapes if 1.1 < c["width"] / c["height"] < 1.25), key=lambda c: c["width"])
        bold = [c for c in page.chars if "Bold" in c["fontname"] and c["text"] == "C"]
    # Between the ends of its arcs (r sqrt 3 from a corner) it is a - r sqrt 3 wide, with r = 0.05 a.
    side = triangle["width"] / MM / 1000.0 / (1.0 - 0.05 * 3.0**0.5)
    area = side**2 * (3.0**0.5 / 4.0 - 3.0 * 0.05**2 * (3.0**0.5 - math.pi / 3.0))
    assert 0.0 <= (2000.0 * area) ** 0.5 - float(stated[1]) < 0.1001
    capitals = max(c["size"] for c in bold)
    height = capitals * CAPITAL / MM / 1000.0
    assert 0.0 <= 300.0 * height - float(stated[2]) < 0.1001
    facts = made.facts()
    assert facts["symbol_side_mm"] == pytest.approx(side * 1e3, rel=1e-3)


def test_the_pdf_is_tagged_embeds_its_fonts_and_is_the_same_each_time() -> None:
    document = sign("3B", **DOOR, languages=["de"]).pdf()
    assert document == sign("3B", **DOOR, languages=["de"]).pdf()
    assert document != sign("3B", **{**DOOR, "room": "Elsewhere"}, languages=["de"]).pdf()
    with pdfplumber.open(io.BytesIO(document)) as opened:
        assert opened.doc.catalog["Lang"] == b"de"
        assert opened.metadata["Title"] == "LASER KLASSE 3B – Bench 4 alignment beam"
        assert all("+SourceSansPro" in c["fontname"] for c in opened.pages[0].chars)
    assert b"<pdfuaid:part>1</pdfuaid:part>" in document


@pytest.mark.parametrize(
    ("options", "field"),
    [
        ({"room": "R" * 80, "sheet": "A6"}, "sign.sheet"),
        ({"kind": "label", "sheet": "own", "label_mm": [20, 10]}, "sign.sheet"),
        ({"extra_lines": ["x " * 60] * 4, "sheet": "A6", "copies": 4}, "sign.sheet"),
    ],
)
def test_what_does_not_fit_is_refused_with_the_reason(options: dict[str, Any], field: str) -> None:
    with pytest.raises(InvalidRequest) as caught:
        sign("4", **options).pdf()
    (error,) = caught.value.errors
    assert error.field == field
    assert "no room" in error.message
    assert "mm" in error.message
    assert error.remedy


def test_long_text_shrinks_then_wraps() -> None:
    short = sign("3B", **DOOR).facts()
    line = "Keep the curtain closed while the light is on and ask before you open it, each time."
    long = sign("3B", **DOOR, extra_lines=[line] * 4)
    assert long.facts()["details_mm"] < short["details_mm"]
    found, made = set_and_read("3B", **DOOR, extra_lines=[line] * 4)
    assert_says_everything(found, made)


@pytest.mark.parametrize("sheet", ["A4", "A6"])
@pytest.mark.parametrize("orientation", ["portrait", "landscape"])
def test_the_code_can_be_read(sheet: str, orientation: str) -> None:
    address = DOOR["address"] + "&wavelength_nm-1=532&mode-1=cw&power_w-1=0.1&diameter_mm-1=2"
    options = {**DOOR, "address": address, "sheet": sheet, "orientation": orientation}
    assert codes(sign("3B", **options).picture("png")) == [address]


def test_an_address_too_long_for_the_sheet_is_left_out_and_told() -> None:
    options = {**DOOR, "address": "https://blinkline.example/" + "x" * 700}
    assert sign("3B", **options, sheet="A3").data["qr"]
    made = sign("3B", **options, sheet="A6")
    assert made.data["qr"] is None
    assert [entry.field for entry in made.content.left_out] == ["sign.address"]


def test_lasers_of_the_checks_are_the_lasers_asked_for() -> None:
    assert set(LASERS) == set(CLASSES)
    assert all(evaluation(c).label for c in CLASSES)
    assert content("1").hazard_class == "1"
