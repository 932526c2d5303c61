"""The working leads to the answer: every value follows from what is printed before it.

The steps are read as a person would read them. Numbers in the text have six significant digits,
so the values must agree to 2e-5.
"""

from __future__ import annotations

import math
import re
from typing import Any

import pytest

from tests.contract.printed import evaluated, numbers_of, printed_limit, steps_of
from tests.web.client import GOOD, Client, laser

CLOSE = 2e-5
EU, ANSI, IEC = "eu-2006-25", "ansi-z136-1-2014", "iec-60825-1-2014"
#: Published with every rule set (ICNIRP 2013, apparent source): alpha_min = 1.5 mrad; T2 = 10 s for it.
ALPHA_MIN, T2_SMALL = 1.5, 10.0


def train(wavelength: float, pulse_s: float, rate_hz: float, **more: Any) -> dict[str, Any]:
    energy = {"energy_j": more.pop("energy_j", 1e-6)}
    return laser(wavelength, {"mode": "train", "pulse_s": pulse_s, "rate_hz": rate_hz, **energy}, **more)


def cw(wavelength: float, power_w: float, **more: Any) -> dict[str, Any]:
    return laser(wavelength, {"mode": "cw", "power_w": power_w}, **more)


def pulse(wavelength: float, energy_j: float, pulse_s: float, **more: Any) -> dict[str, Any]:
    return laser(wavelength, {"mode": "pulse", "energy_j": energy_j, "pulse_s": pulse_s}, **more)


TWO = cw(532, 0.1)
TWO["lines"] += train(905, 1e-7, 5e3)["lines"]
LASERS = {
    "contract example": GOOD,
    "infrared, 1.5 mm aperture growing": cw(10600, 10, exposure_s=3, divergence_mrad=8),
    "nothing exceeded": cw(633, 1e-5),
    "blue, long, extended": cw(470, 0.1, exposure_s=1000, subtense_mrad=20),
    "blue, wider than the field": cw(440, 0.1, exposure_s=50, subtense_mrad=120),
    "pulse": pulse(1064, 0.05, 1e-8),
    "pulse below 1 ns": pulse(308, 0.1, 1e-10),
    "pulse, extended": pulse(850, 0.01, 1e-3, subtense_mrad=50),
    "train": train(905, 1e-7, 5e3, exposure_s=5),
    "train, default duration": train(905, 1e-7, 5e3),
    "train, grouped": train(905, 1e-9, 1e6, subtense_mrad=10),
    "train, grouped, small source": train(532, 1e-11, 8e7, energy_j=1e-9),
    "train, long pulses, extended": train(800, 1e-3, 20, energy_j=1e-3, subtense_mrad=30),
    "train, single pulse at most": train(1064, 1e-8, 0.5, exposure_s=1, energy_j=1e-3),
    "directive, capped": cw(1060, 10, rules=EU, subtense_mrad=60),
    "directive, train": train(905, 1e-7, 5e3, rules=EU),
    "ansi, second limit": pulse(1310, 0.1, 1e-3, rules=ANSI),
    "ansi, train": train(905, 1e-7, 5e3, rules=ANSI, subtense_mrad=8),
    "iec": cw(1550, 2, rules=IEC, exposure_s=0.5),
    "top hat": cw(532, 0.1, profile="tophat"),
    "waist ahead": cw(532, 0.1, waist_m=2, diameter_mm=0.2, divergence_mrad=4),
    "two lines": TWO,
}


@pytest.fixture(scope="module", params=LASERS.values(), ids=LASERS.keys())
def answer(client: Client, request: pytest.FixtureRequest) -> dict[str, Any]:
    return client.evaluate(request.param)


def criteria(answer: dict[str, Any]) -> list[tuple[str, int, dict[str, Any], list[dict[str, Any]]]]:
    """Target, number, criterion and its steps."""
    return [
        (target, k, c, [s for s in steps_of(answer, target=target, criterion=k) if s["symbol"] != "lead"])
        for target in ("eye", "skin")
        for k, c in enumerate(answer[target]["criteria"])
    ]


def known_before(answer: dict[str, Any], line: int, steps: list[dict[str, Any]]) -> dict[str, float]:
    """Values by symbol: those of the line, then those of the criterion."""
    of_line = steps_of(answer, line=line, target=None)
    return {s["symbol"]: s["value"] for s in [*of_line, *steps] if s["symbol"].isidentifier()}


def value_of(steps: list[dict[str, Any]], symbol: str) -> float:
    (step,) = (s for s in steps if s["symbol"] == symbol)
    return float(step["value"])


def test_every_step_is_complete(answer: dict[str, Any]) -> None:
    for step in answer["working"]:
        assert step["symbol"].strip()
        assert step["text"].strip()
        assert step["unit"].strip()
        assert step["known"] in ("read", "memory", "computed", "entered")
        if step["known"] in ("read", "memory"):
            assert step["source"].strip(), step
        assert step["value"] is None or math.isfinite(step["value"])


def test_inputs_come_first(answer: dict[str, Any]) -> None:
    for number, line in enumerate(answer["inputs"]["lines"]):
        steps = steps_of(answer, line=number, target=None)
        assert [s["symbol"] for s in steps[:3]] == ["lambda", "T", "alpha"]
        assert steps[0]["value"] == line["wavelength_nm"]
        assert steps[1]["value"] == answer["durations"][number]["exposure_s"]
        assert steps[2]["value"] == max(line["subtense_mrad"], ALPHA_MIN)


def test_factors_of_a_line(answer: dict[str, Any]) -> None:
    for number in range(len(answer["inputs"]["lines"])):
        for step in steps_of(answer, line=number, target=None)[3:]:
            name, _, expression = step["text"].partition(" = ")
            assert name == step["symbol"]
            assert step["value"] == pytest.approx(evaluated(expression), rel=CLOSE)


def test_factors_of_time(answer: dict[str, Any]) -> None:
    """C_E and F_gamma by the form printed, with alpha and the angle printed beside it."""
    for _, _, c, steps in criteria(answer):
        alpha = value_of(steps_of(answer, line=c["line"], target=None), "alpha")
        for step in (s for s in steps if s["symbol"] in ("C_E", "F_gamma")):
            form, _, rest = step["text"].partition(" = ")[2].partition(", ")
            angle = {"C_E": "alpha_max = # mrad", "F_gamma": "field angle # mrad"}[step["symbol"]]
            told, other = numbers_of(f"{rest}", "alpha = # mrad", angle)
            assert told == pytest.approx(alpha, rel=CLOSE)
            names = {"alpha": alpha, "alpha_min": ALPHA_MIN, "alpha_max": other, "gamma": other}
            form = form.replace("(alpha_min alpha_max)", "(alpha_min x alpha_max)")
            assert step["value"] == pytest.approx(evaluated(form, names), rel=CLOSE)


def test_limits(answer: dict[str, Any]) -> None:
    """coefficient x t^power x factors, then the share of a pulse, is the limit of the answer."""
    for _, _, c, steps in criteria(answer):
        (step,) = (s for s in steps if s["symbol"] == "H_MPE")
        assert f"row {c['row']} ({c['tissue']}, {c['effect']})" in step["text"]
        assert numbers_of(step["text"], "at # s:")[0] == pytest.approx(c["duration_s"], rel=CLOSE)
        known = known_before(answer, c["line"], steps)
        assert step["value"] == pytest.approx(printed_limit(step["text"], known), rel=CLOSE)
        limit = step["value"]
        if c["rule"] == "average":
            limit /= value_of(steps, "N")
        if c["rule"] == "train":
            group = [s["value"] for s in steps if s["symbol"] == "n"] or [1.0]
            factor = next(s for s in steps if s["symbol"].startswith("H_MPE x "))["symbol"].split()[-1]
            limit *= value_of(steps, factor) / group[0]
        assert c["limit_j_m2"] == pytest.approx(limit, rel=1e-12)


def test_pulse_counts(answer: dict[str, Any]) -> None:
    for _, _, c, steps in criteria(answer):
        if c["pulses"] is None:
            assert all(s["symbol"] != "N" for s in steps)
            continue
        of_line = steps_of(answer, line=c["line"], target=None)
        emission = answer["inputs"]["lines"][c["line"]]["emission"]
        rate, exposure = emission["rate_hz"], value_of(of_line, "T")
        if c["rule"] == "train":
            (text,) = (s["text"] for s in steps if s["symbol"] == "N")
            break_time = [s["value"] for s in of_line if s["symbol"] == "T2"] or [T2_SMALL]
            within = min(exposure, break_time[0]) if "T2" in text else exposure
            grouped = [s for s in steps if s["symbol"] == "n"]
            assert text.startswith("groups" if grouped else "pulses")
            for step in grouped:
                (time,) = numbers_of(step["text"], "closer than # s")
                assert step["value"] == pytest.approx(rate * time, rel=CLOSE)
                assert step["value"] > 1
                rate = 1 / time
            exposure = within
        count = max(1.0, rate * exposure)
        assert value_of(steps, "N") == c["pulses"] == pytest.approx(count, rel=CLOSE)


def test_pulse_factor(answer: dict[str, Any]) -> None:
    for _, _, c, steps in criteria(answer):
        if c["pulse_factor"] is None:
            continue
        symbol = next(s for s in steps if s["symbol"].startswith("H_MPE x "))["symbol"].split()[-1]
        (step,) = (s for s in steps if s["symbol"] == symbol)
        match = re.fullmatch(r"row [\w-]+: (.+?)(?:, at least ([\d.]+))?, at most 1", step["text"])
        assert match, step["text"]
        value = min(1.0, max(float(match[2] or 0), evaluated(match[1], {"N": value_of(steps, "N")})))
        assert step["value"] == c["pulse_factor"] == pytest.approx(value, rel=1e-9)


def test_apertures(answer: dict[str, Any]) -> None:
    for _, _, c, steps in criteria(answer):
        (step,) = (s for s in steps if s["symbol"] == "a")
        expression = step["text"].partition(": ")[2].removesuffix(" mm")
        assert step["value"] == c["aperture_mm"] == pytest.approx(evaluated(expression), rel=CLOSE)


def test_exposures_and_ratios(answer: dict[str, Any]) -> None:
    """H = dose x fraction / (pi/4 a^2); the fraction of a round beam by its own formula."""
    for target, _, c, steps in criteria(answer):
        (step,) = (s for s in steps if s["symbol"] == "H")
        dose, inside, place = numbers_of(step["text"], ": # J", "J x # (fraction", "at # m")
        assert f"(rule {c['rule']})" in step["text"]
        line = answer["inputs"]["lines"][c["line"]]
        emission, beam = line["emission"], line["beam"]
        seconds = answer["durations"][c["line"]]["exposure_s"]
        given = emission["power_w"] * seconds if emission["mode"] == "cw" else emission["energy_j"]
        assert dose == pytest.approx(given, rel=CLOSE)
        assert place == pytest.approx(answer[target]["worst_place_m"], rel=CLOSE)
        spread = beam["divergence_mrad"] * 1e-3 * (place - beam["waist_m"]) * 1e3
        width = math.hypot(beam["diameter_mm"], spread)
        a = c["aperture_mm"]
        if beam["profile"] == "tophat":
            fraction = min(1.0, (a / width) ** 2)
        else:
            # 1/e2 diameters throughout: 1 - exp(-2 (a/d)^2).
            fraction = 1 - math.exp(-2 * (a / width) ** 2)
        assert inside == pytest.approx(fraction, rel=CLOSE)
        area = math.pi / 4 * (a * 1e-3) ** 2
        assert step["value"] == c["exposure_j_m2"] == pytest.approx(dose * inside / area, rel=CLOSE)
        ratio = value_of(steps, "H / H_MPE")
        assert ratio == c["hazard_ratio"] == pytest.approx(step["value"] / c["limit_j_m2"], rel=1e-9)
        text = next(s["text"] for s in steps if s["symbol"] == "H / H_MPE")
        assert ratio == pytest.approx(evaluated(text), rel=CLOSE)


@pytest.mark.parametrize("target", ["eye", "skin"])
def test_verdict(answer: dict[str, Any], target: str) -> None:
    found = answer[target]
    ratios = sorted((c["hazard_ratio"] for c in found["criteria"]), reverse=True)
    (lead,) = (s for s in steps_of(answer, target=target) if s["symbol"] == "lead")
    assert lead["criterion"] == found["governing"]
    assert lead["text"].startswith(f"criterion {found['governing'] + 1} ")
    if len(ratios) == 1:
        assert lead["value"] is None
    else:
        assert lead["value"] == pytest.approx(ratios[0] / ratios[1], rel=1e-9)
    (density,) = (s for s in steps_of(answer, target=target) if s["symbol"] == "OD")
    expected = max(0.0, evaluated(density["text"].partition(",")[0]))
    assert density["value"] == found["optical_density"] == pytest.approx(expected, abs=1e-5)
    assert density["value"] == pytest.approx(max(0.0, math.log10(found["hazard_ratio"])), abs=1e-12)


@pytest.mark.parametrize("target", ["eye", "skin"])
def test_distance_by_hand(answer: dict[str, Any], target: str) -> None:
    """z = z_0 + sqrt(a^2 / -ln(1 - 1 / S) - d_0^2) / phi, with the figures printed beside it."""
    found = answer[target]
    (step,) = (s for s in steps_of(answer, target=target) if s["symbol"] == "z")
    assert step["value"] == found["hazard_distance_m"]
    if step["value"] == 0:
        assert found["hazard_zone_m"] is None
        return
    if "by hand" not in step["text"]:
        several = len(answer["inputs"]["lines"]) > 1
        assert several or answer["inputs"]["lines"][0]["beam"]["profile"] == "tophat"
        return
    formula = re.search(r"by hand: (.+?) with S", step["text"])
    assert formula
    whole, a, d, phi, z_0 = numbers_of(
        step["text"], "S = #", "a = # mm", "d_0 = # mm", "phi = # mrad", "z_0 = # m"
    )
    printed = evaluated(formula[1], {"S": whole, "a": a, "d_0": d, "phi": phi, "z_0": z_0})
    assert step["value"] == pytest.approx(printed, rel=5 * CLOSE)
    # S is the ratio of one criterion over the fraction inside its aperture.
    possible = []
    for which, _, c, steps in criteria(answer):
        (inside,) = numbers_of(next(s["text"] for s in steps if s["symbol"] == "H"), "J x # (fraction")
        if which == target and c["aperture_mm"] == pytest.approx(a, rel=CLOSE):
            possible.append(c["hazard_ratio"] / inside)
    assert any(whole == pytest.approx(ratio, rel=CLOSE) for ratio in possible)
    (width,) = (s for s in steps_of(answer, target=target) if s["symbol"] == "d(z)")
    assert width["value"] == pytest.approx(math.hypot(d, phi * (printed - z_0)), rel=5 * CLOSE)
    near = [s["value"] for s in steps_of(answer, target=target) if s["symbol"] == "z_near"]
    assert (near or [0.0])[0] == found["hazard_zone_m"][0]


def test_sum_of_lines(client: Client) -> None:
    """Two retinal lines add, each with its worst criterion (additivity: 400-1400 nm with itself)."""
    answer = client.evaluate(TWO)
    worst = [max(c["hazard_ratio"] for c in answer["eye"]["criteria"] if c["line"] == k) for k in (0, 1)]
    (step,) = (s for s in steps_of(answer, target="eye") if s["symbol"] == "sum of H / H_MPE")
    assert step["value"] == answer["eye"]["hazard_ratio"] == pytest.approx(sum(worst), rel=1e-12)


def test_the_cap_of_the_directive_bites(client: Client) -> None:
    """Annex II Table 2.3 (from memory): at most 1000 W/m2; 18 x 5 x 40 x 39.26^-0.25 = 1438 W/m2."""
    answer = client.evaluate(LASERS["directive, capped"])
    assert answer["eye"]["criteria"][0]["limit_w_m2"] == 1000
    assert "at most 1000 W/m2" in " ".join(s["text"] for s in answer["working"])


@pytest.mark.parametrize("name", ["train, default duration", "blue, long, extended", "ansi, train"])
def test_every_symbol_that_is_used_is_shown_with_its_value(client: Client, name: str) -> None:
    """A reader cannot follow N within the shorter of T and T2, or alpha / alpha_min, without them."""
    working = client.evaluate(LASERS[name])["working"]
    shown = {s["symbol"] for s in working}
    told = " ".join(s["text"] for s in working)
    for symbol in ("T2", "alpha_min"):
        if re.search(rf"\b{symbol}\b", told):
            assert symbol in shown or re.search(rf"\b{symbol} = [\d.]+", told), symbol
