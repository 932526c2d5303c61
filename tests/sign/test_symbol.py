"""The symbol: proportions, yellow share, viewing distance, contrast of the colours."""

from __future__ import annotations

import io
import math
import re
from xml.etree import ElementTree

import numpy as np
import pytest
import typst
from PIL import Image

from service.sign.symbol import alert_symbol, laser_symbol, viewing_distance_m, yellow_share
from service.sign.tables import sign_tables

#: From memory of IEC 60825-1 Figure 1, as shares of the side.
PROPORTIONS = {"margin": 0.02, "band": 0.06, "radius": 0.05}
BURST = {"short": 0.28, "disc": 0.14, "stroke": 0.02}
SVG = "{http://www.w3.org/2000/svg}"


def picture(svg: str, width_px: int) -> Image.Image:
    """A drawing on white."""
    source = f"#set page(width: {width_px}pt, height: auto, margin: 0pt)\n"
    source += "#image(bytes(sys.inputs.svg), width: 100%)"
    made = typst.compile(source.encode(), format="png", ppi=72, sys_inputs={"svg": svg})
    assert isinstance(made, bytes)
    return Image.open(io.BytesIO(made)).convert("RGB")


def test_proportions_are_those_published() -> None:
    table = sign_tables().symbol
    assert {k: getattr(table.triangle, k) for k in PROPORTIONS} == PROPORTIONS
    assert {k: getattr(table.burst, k) for k in BURST} == BURST
    # The long rays stay clear of the band: the inner triangle's inscribed radius is a / (2 sqrt 3) - 0.08 a.
    clear = 1.0 / (2.0 * math.sqrt(3.0)) - 0.08
    assert table.burst.long / 2.0 <= 0.20 < clear
    # Along the base the slope leaves clear / cos 30 degrees.
    assert table.burst.beam / 2.0 < clear / math.cos(math.pi / 6.0)


def test_the_drawing_is_a_triangle_with_a_burst() -> None:
    root = ElementTree.fromstring(laser_symbol())
    assert root.find(f"{SVG}title") is not None
    paths = [p.attrib for p in root.iter(f"{SVG}path")]
    assert [p["fill"] for p in paths] == ["#f9a800", "#000000", "#f9a800", "none"]
    assert len(re.findall("M", paths[-1]["d"])) == 24
    (circle,) = root.iter(f"{SVG}circle")
    # The centre of an equilateral triangle of side 100 lies 100 / (2 sqrt 3) = 28.87 above its base.
    assert float(circle.attrib["cx"]) == 50.0
    assert float(circle.attrib["cy"]) == pytest.approx(86.6025 - 28.8675, abs=1e-3)
    assert float(circle.attrib["r"]) == 7.0


def test_yellow_covers_at_least_half_of_the_triangle() -> None:
    """ISO 3864-1: yellow is at least half of a warning sign. Counted on the drawing, dot by dot."""
    yellow = black = 0
    dots = np.asarray(picture(laser_symbol(), 600)).reshape(-1, 3).astype(int).tolist()
    for r, g, b in dots:
        if (r, g, b) == (255, 255, 255):
            continue
        # Edges blend; a dot counts as what it is nearer to.
        if abs(r - 0xF9) + abs(g - 0xA8) + b < r + g + b:
            yellow += 1
        else:
            black += 1
    share = yellow / (yellow + black)
    assert share >= 0.5
    # The formula counts overlapping rays twice: it is the smaller figure, and still above half.
    assert 0.5 <= yellow_share() <= share + 0.005


def test_viewing_distance_is_the_smaller_of_two_rules() -> None:
    """ISO 3864-1 (read on sign makers' pages): h = L / 40, A = L^2 / 2000; h and A of the triangle."""
    side = 0.1
    # Sharp triangle: A = sqrt(3) / 4 a^2 = 4.330e-3 m2 gives 2.943 m, h = 0.0866 m gives 3.464 m. Round
    # corners (r = 5 mm) take 3 r^2 (sqrt 3 - pi / 3) = 5.14e-5 m2 away: sqrt(2000 x 4.2787e-3) = 2.9253 m.
    assert viewing_distance_m(side) == pytest.approx(2.9253, abs=2e-4)
    assert viewing_distance_m(side) < 2.943
    assert viewing_distance_m(2 * side) == pytest.approx(2 * viewing_distance_m(side))


def luminance(colour: str) -> float:
    """Relative luminance of an sRGB colour (WCAG 2.2)."""
    parts = [int(colour[k : k + 2], 16) / 255.0 for k in (1, 3, 5)]
    linear = [p / 12.92 if p <= 0.04045 else ((p + 0.055) / 1.055) ** 2.4 for p in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    dark, light = sorted((luminance(one), luminance(other)))
    return (light + 0.05) / (dark + 0.05)


def test_words_stand_out_from_their_ground() -> None:
    tables = sign_tables()
    for name, signal in tables.words.signal.items():
        assert contrast(signal.background, signal.text) >= 4.5, name
    assert contrast(tables.symbol.colours.yellow, tables.symbol.colours.black) >= 7.0


def test_signal_colours_are_those_of_the_standard() -> None:
    """ANSI Z535.2: white on red, black on orange and yellow, white on blue (read on a sign-trade page)."""

    def hue(colour: str) -> str:
        r, g, b = (int(colour[k : k + 2], 16) for k in (1, 3, 5))
        if b == max(r, g, b):
            return "blue"
        return "red" if g < 0.3 * r else "orange" if g < 0.7 * r else "yellow"

    found = {n: (hue(s.background), s.text) for n, s in sign_tables().words.signal.items()}
    white, black = "#ffffff", "#000000"
    assert found == {
        "danger": ("red", white),
        "warning": ("orange", black),
        "caution": ("yellow", black),
        "notice": ("blue", white),
    }


def test_the_alert_symbol_takes_the_colours_of_the_band() -> None:
    fills = re.findall(r'fill="(#\w+)"', alert_symbol("#ffffff", "#c8102e"))
    assert fills == ["#ffffff", "#c8102e", "#c8102e"]
