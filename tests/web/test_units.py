"""Units of the form: what is typed in any unit is the SI value, and is told back."""

from __future__ import annotations

import json
import math
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.web.units import FAMILIES, convert, echo
from tests.web.client import Client
from tests.web.pages import CW, address, page
from tests.web.shape import assert_problem
from tests.web.test_addresses import ONE, target

#: Prefixes and the degree, pi/180 rad, after the SI brochure (9th edition, tables 7 and 8, from memory); the
#: international foot is 0.3048 m (1959 agreement, from memory).
TYPED = [
    ("wavelength_nm-1", "0.532", "um", "lines.0.wavelength_nm", 532.0),
    ("power_w-1", "100", "mW", "lines.0.emission.power_w", 0.1),
    ("power_w-1", "250", "uW", "lines.0.emission.power_w", 0.00025),
    ("power_w-1", "1,5", "kW", "lines.0.emission.power_w", 1500.0),
    ("diameter_mm-1", "800", "um", "lines.0.beam.diameter_mm", 0.8),
    ("diameter_mm-1", "1.2", "cm", "lines.0.beam.diameter_mm", 12.0),
    ("divergence_mrad-1", "500", "urad", "lines.0.beam.divergence_mrad", 0.5),
    ("divergence_mrad-1", "1", "deg", "lines.0.beam.divergence_mrad", math.pi / 0.18),
    ("waist_m-1", "12", "cm", "lines.0.beam.waist_m", 0.12),
    ("exposure_s", "250", "ms", "exposure_s", 0.25),
    ("distance_m", "10", "ft", "viewing.distance_m", 3.048),
    ("distance_m", "0.002", "km", "viewing.distance_m", 2.0),
]


def body(root: Any) -> dict[str, Any]:
    shown: dict[str, Any] = json.loads(root.one("pre").text)
    return shown


@pytest.mark.parametrize(("name", "typed", "unit", "path", "value"), TYPED)
def test_a_value_in_any_unit_is_the_si_value(
    client: Client, name: str, typed: str, unit: str, path: str, value: float
) -> None:
    found: Any = body(page(client, address({**CW, name: typed, f"{name}.in": unit})))
    for step in path.split("."):
        found = found[int(step)] if isinstance(found, list) else found[step]
    assert found == pytest.approx(value, rel=1e-15)


PULSED = {
    "lines": "1", "wavelength_nm-1": "1064", "mode-1": "train", "energy_j-1": "50", "energy_j-1.in": "mJ",
    "pulse_s-1": "8", "pulse_s-1.in": "ns", "rate_hz-1": "0.02", "rate_hz-1.in": "kHz", "diameter_mm-1": "6",
    "divergence_mrad-1": "0.5",
}  # fmt: skip


def test_pulses_in_the_units_of_data_sheets(client: Client) -> None:
    root = page(client, address(PULSED))
    emission = body(root)["lines"][0]["emission"]
    assert emission == {"mode": "train", "energy_j": 0.05, "pulse_s": 8e-9, "rate_hz": 20.0}
    assert root.by_id("pulse_s-1-echo").text == "= 8 × 10⁻⁹ s"
    assert root.by_id("energy_j-1-echo").text == "= 0.05 J"
    assert root.by_id("pulse_s-1").attributes["value"] == "8"
    (chosen,) = (o for o in root.by_id("pulse_s-1-unit").all("option") if "selected" in o.attributes)
    assert chosen.attributes["value"] == "ns"


def test_an_address_keeps_the_unit_and_drops_the_usual_one(client: Client) -> None:
    kept = target(client, ONE.replace("power_w-1=0.1", "power_w-1=100&power_w-1.in=mW"))
    assert "power_w-1=100&power_w-1.in=mW" in kept
    assert target(client, kept) == kept
    assert target(client, ONE + "&power_w-1.in=W&wavelength_nm-1.in=nm&exposure_s.in=s") == ONE


BAD = {
    "unit of another kind": ("&power_w-1.in=mJ", "power_w-1.in"),
    "unit of no number": ("&label.in=mW", "label.in"),
    "unit of no field": ("&colour.in=nm", "colour.in"),
    "unit of a line that is not there": ("&power_w-2.in=mW", "power_w-2.in"),
    "unit of a shelf pair": ("&shelf-near-infrared.in=1", "shelf-near-infrared.in"),
    "unit twice": ("&power_w-1.in=mW&power_w-1.in=mW", "power_w-1.in"),
    "capital letters": ("&power_w-1.in=MW", "power_w-1.in"),
}


@pytest.mark.parametrize(("more", "name"), BAD.values(), ids=BAD.keys())
def test_unknown_units_are_refused_never_guessed(client: Client, more: str, name: str) -> None:
    """MW for mW would be off by a billion: it is refused."""
    assert_problem(client.get(ONE + more), 400, name)


#: Typed text, family, unit: what is told back, written by hand.
ECHOES = [
    ("5", "power", "mW", "= 0.005 W"),
    ("0.005", "power", "W", "= 5 mW"),
    ("8e-9", "time", "s", "= 8 ns"),
    ("8", "time", "ns", "= 8 × 10⁻⁹ s"),
    ("80", "rate", "MHz", "= 8 × 10⁷ Hz"),
    ("8e7", "rate", "Hz", "= 80 MHz"),
    ("1", "angle", "deg", "≈ 17.4533 mrad"),
    ("532", "wavelength", "nm", ""),
    ("532.0", "wavelength", "nm", "= 532 nm"),
    ("1064,5", "wavelength", "nm", "= 1064.5 nm"),
    ("10.6", "wavelength", "um", "= 10600 nm"),
    ("20", "share", "pc", "= 0.2 of 1"),
]


@pytest.mark.parametrize(("typed", "family", "unit", "told"), ECHOES)
def test_what_was_understood_is_told(typed: str, family: str, unit: str, told: str) -> None:
    assert echo(float(typed.replace(",", ".")), typed, family, unit) == told


@given(st.sampled_from(sorted(FAMILIES)), st.floats(1e-12, 1e12), st.data())
def test_conversion_is_the_factor_to_a_rounding(family: str, value: float, data: st.DataObject) -> None:
    unit = data.draw(st.sampled_from(FAMILIES[family]))
    assert convert(value, family, unit.key) == pytest.approx(value * float(unit.factor), rel=1e-15)
    assert convert(value, family, FAMILIES[family][0].key) == value
