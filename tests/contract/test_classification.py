"""Hazard classes in the answer: every level can be followed from what is printed beside it.

Numbers in the text of a step have six significant digits, so values must agree to 2e-5. Factors are taken
from `tests.reference`, written from the published numbers alone (from memory).
"""

from __future__ import annotations

import math
import re
from typing import Any

import pytest

from tests.contract.printed import evaluated, numbers_of
from tests.reference.plain_ael_us import k_1, k_2
from tests.reference.plain_beam import beam, encircled_fraction
from tests.reference.plain_classes import measurement
from tests.reference.plain_factors import IEC as IEC_FACTORS
from tests.reference.plain_factors import c_a, c_b, c_c, c_e, photochemical_size_factor, t_2
from tests.rules.class_engine import IEC, US, table
from tests.web.client import Client, laser

CLOSE = 2e-5
NUMBER = r"\d+(?:\.\d+)?(?:e[+-]?\d+)?"


def cw(nm: float, power_w: float, **more: Any) -> dict[str, Any]:
    return laser(nm, {"mode": "cw", "power_w": power_w}, **more)


def pulse(nm: float, energy_j: float, pulse_s: float, **more: Any) -> dict[str, Any]:
    return laser(nm, {"mode": "pulse", "energy_j": energy_j, "pulse_s": pulse_s}, **more)


def train(nm: float, energy_j: float, pulse_s: float, rate_hz: float, **more: Any) -> dict[str, Any]:
    emission = {"mode": "train", "energy_j": energy_j, "pulse_s": pulse_s, "rate_hz": rate_hz}
    return laser(nm, emission, **more)


LASERS = {
    "pointer": cw(633, 2e-3),
    "blue": cw(470, 1e-3),
    "wide and parallel": cw(633, 2e-3, diameter_mm=30, divergence_mrad=0.1),
    "infrared": cw(850, 5e-3, divergence_mrad=200),
    "extended": cw(850, 0.01, subtense_mrad=30),
    "blue, extended": cw(440, 0.01, subtense_mrad=40),
    "1064 nm": cw(1064, 1.0),
    "1310 nm": cw(1310, 0.4),
    "1550 nm": cw(1550, 0.02),
    "carbon dioxide": cw(10600, 10),
    "254 nm": cw(254, 1e-4),
    "310 nm": cw(310, 1e-4),
    "355 nm": cw(355, 1e-4),
    "750 nm": cw(750, 1e-4),
    "pulse": pulse(1064, 1e-5, 1e-8),
    "pulse, 310 nm": pulse(310, 1e-5, 1e-8),
    "pulse, 1540 nm": pulse(1540, 1e-2, 1e-8),
    "pulse, 10.6 um": pulse(10600, 1e-2, 1.0),
    "pulse of 0.1 s": pulse(1064, 1.0, 0.1),
    "pulse, extended": pulse(850, 1e-3, 1e-3, subtense_mrad=50),
    "train": train(905, 1e-6, 1e-7, 5e3),
    "train, extended": train(850, 1e-4, 1e-3, 20, subtense_mrad=30),
    "train, few": train(532, 1e-6, 1e-8, 5),
    "train, grouped": train(905, 1e-9, 1e-9, 1e6, subtense_mrad=10),
    "train, grouped by far": train(532, 1e-12, 1e-11, 8e7),
    "waist ahead": cw(532, 1e-3, waist_m=2, diameter_mm=0.2, divergence_mrad=4),
    "top hat": cw(532, 1e-3, profile="tophat"),
}


@pytest.fixture(scope="module", params=LASERS.values(), ids=LASERS.keys())
def asked(client: Client, request: pytest.FixtureRequest) -> tuple[dict[str, Any], dict[str, Any]]:
    return request.param, client.evaluate(request.param)


def levels(answer: dict[str, Any]) -> list[tuple[str, dict[str, Any], dict[str, dict[str, Any]]]]:
    """Scheme, level and its steps by symbol."""
    found = []
    for scheme in answer["classification"]:
        parts: list[dict[str, dict[str, Any]]] = []
        for step in scheme["working"]:
            if step["symbol"] == "T":
                parts.append({})
            parts[-1][step["symbol"]] = step
        with_limits = [level for level in scheme["levels"] if level["limit"] is not None]
        assert len(parts) == len(with_limits)
        found += [(scheme["scheme"], level, steps) for level, steps in zip(with_limits, parts, strict=True)]
    return found


def factors(line: dict[str, Any], t: float) -> dict[str, float]:
    """Every factor of both schemes for a line and a time [s]; only those of its band mean anything."""
    nm, alpha = line["wavelength_nm"], line.get("subtense_mrad", 1.5)
    short = 100.0 if 1535 <= nm < 1545 else 1.0
    found = {
        "C1": 5600 * t**0.25,
        "C6": c_e(IEC_FACTORS, alpha, t),
        "T2": t_2(alpha),
        "F_gamma": photochemical_size_factor(alpha, t),
        "k1": k_1(nm, t),
        "k2": k_2(nm, t),
        "k1_short": short,
    }
    if nm < 400:
        found["C2"] = 10 ** (0.2 * (nm - 295))
    elif nm < 1400:
        found |= {"C3": c_b(min(nm, 600)), "C4": c_a(nm), "C7": c_c(IEC_FACTORS, nm)}
    return found


def test_both_schemes_answer_the_default_first(client: Client) -> None:
    found = client.evaluate(cw(633, 2e-3))["classification"]
    assert [c["scheme"] for c in found] == [IEC, US]
    assert [c["hazard_class"] for c in found] == ["3R", "IIIa"]
    assert [[x["limits"] for x in c["levels"]] for c in found] == [
        ["1", "2", "3R", "3B"],
        ["I", "IIa", "II", "IIIa", "IIIb"],
    ]
    for scheme in found:
        for key in ("title", "standing", "standing_text"):
            assert scheme[key].strip()
        assert re.fullmatch(r"sha256:[0-9a-f]{64}", scheme["digest"])


def test_a_pointer_in_figures(client: Client) -> None:
    """2 mW at 633 nm by hand: 2/0.39, 2/1, 2/5 and 2/500 of Classes 1, 2, 3R and 3B (IEC Tables 3 to 8)."""
    found = client.evaluate(cw(633, 2e-3, profile="tophat"))["classification"][0]["levels"]
    assert [x["ratio"] for x in found] == pytest.approx([2 / 0.39, 2, 0.4, 0.004], rel=1e-12)
    assert [x["limit"] for x in found] == pytest.approx([3.9e-4, 1e-3, 5e-3, 0.5], rel=1e-12)
    assert [x["accessible_emission"] for x in found] == pytest.approx([2e-3] * 4, rel=1e-12)
    assert [x["margin"] for x in found] == [
        "Class 1 exceeded 5.13 times",
        "Class 2 exceeded 2.00 times",
        "Class 3R holds with 60 % left",
        "Class 3B holds with 99 % left",
    ]


def test_every_ratio_is_emission_over_limit(asked: tuple) -> None:
    _, answer = asked
    for _, level, _ in levels(answer):
        ratio = level["accessible_emission"] / level["limit"]
        assert level["ratio"] == pytest.approx(ratio, rel=1e-12), level
        assert level["holds"] == (level["ratio"] <= 1)
        assert level["condition"] in ("1", "3")
        assert level["line"] == 0


def test_units_are_watts_for_continuous_and_joules_for_pulsed_lasers(asked: tuple) -> None:
    body, answer = asked
    continuous = body["lines"][0]["emission"]["mode"] == "cw"
    for _, level, _ in levels(answer):
        assert level["unit"] in (("W", "W/m2") if continuous else ("J", "J/m2"))
        assert (level["rule"] == "exposure") == continuous


def test_every_level_names_its_row_and_source(asked: tuple) -> None:
    _, answer = asked
    for scheme, level, _ in levels(answer):
        (row,) = (r for r in table(scheme, "limits") if r["row"] == level["row"])
        assert row["target"] == level["limits"]
        assert row["locator"] in level["source"]
        assert level["known"] == row["known"] == "memory"
        assert level["note"] == row["note"]


def test_limits_follow_from_their_expressions(asked: tuple) -> None:
    body, answer = asked
    for _, level, steps in levels(answer):
        step = steps[f"AEL_{level['limits']}"]
        printed = re.fullmatch(
            rf"Class \w+: limit of row (\S+) at ({NUMBER}) s, rule (\w+): (.+?)"
            rf"(?:, at most ({NUMBER}) (?:J|W)(?:/m2)?)?",
            step["text"],
        )
        assert printed, step["text"]
        row, t, rule, expression, cap = printed.groups()
        assert (row, rule) == (level["row"], level["rule"])
        values = factors(body["lines"][0], float(t))
        power = re.fullmatch(rf"\((.+)\) W(?:/m2)? x ({NUMBER}) s", expression)
        per = float(power[2]) if power else 1.0
        value = evaluated(power[1] if power else expression, values)
        if cap:
            value = min(value, float(cap))
        assert step["value"] == pytest.approx(value * per, rel=CLOSE), step
        assert step["source"].startswith(level["source"])


def test_the_share_of_one_pulse_follows_from_the_text(asked: tuple) -> None:
    """Average: / N. Train: x C5, and / the pulses of a group where pulses count together."""
    _, answer = asked
    for _, level, steps in levels(answer):
        whole = steps[f"AEL_{level['limits']}"]["value"]
        step = steps.get(f"AEL_{level['limits']} per pulse")
        if level["rule"] in ("average", "train"):
            assert step is not None, level
        if step is None:
            scale = float(numbers_of(steps[f"AEL_{level['limits']}"]["text"], "at # s")[0])
            per = scale if level["rule"] == "exposure" else 1.0
            assert level["limit"] == pytest.approx(whole / per, rel=CLOSE)
            continue
        assert step["value"] == level["limit"]
        if level["rule"] == "average":
            (count,) = numbers_of(step["text"], "/ # pulses")
            assert step["value"] == pytest.approx(whole / count, rel=CLOSE)
        else:
            factor = steps["C5"]
            printed = re.fullmatch(
                rf"row \S+: (.+?)(?:, at least ({NUMBER}))?, at most 1, with N = ({NUMBER}) pulses or groups",
                factor["text"],
            )
            assert printed, factor["text"]
            value = evaluated(printed[1], {"N": float(printed[3])})
            c5 = min(1.0, max(value, float(printed[2] or 0)))
            assert factor["value"] == pytest.approx(c5, rel=CLOSE)
            group = re.search(rf"/ ({NUMBER}) pulses in a group", step["text"])
            share = float(group[1]) if group else 1.0
            assert step["value"] == pytest.approx(whole * c5 / share, rel=CLOSE), step["text"]


def test_the_time_base_is_that_of_the_limits(asked: tuple) -> None:
    body, answer = asked
    nm = body["lines"][0]["wavelength_nm"]
    for scheme, level, steps in levels(answer):
        (base,) = (
            float(r["duration_s"])
            for r in table(scheme, "timebases")
            if r["target"] == level["limits"]
            and float(r["wavelength_from_nm"]) <= nm < float(r["wavelength_to_nm"])
        )
        assert steps["T"]["value"] == base
        if level["rule"] in ("exposure", "average"):
            assert numbers_of(steps[f"AEL_{level['limits']}"]["text"], "at # s") == [base]


@pytest.mark.parametrize(
    ("nm", "scheme", "limits", "seconds"),
    [
        # IEC 4.3 e): 100 s from 400 nm on, but 0.25 s for Class 3R in 400-700 nm; 100 s from 700 nm on.
        (400, IEC, "1", 100),
        (400, IEC, "3R", 0.25),
        (400, IEC, "3B", 100),
        (700, IEC, "3R", 100),
    ],
)
def test_the_time_base_on_a_boundary(
    client: Client, nm: float, scheme: str, limits: str, seconds: float
) -> None:
    """The band that begins at a wavelength holds there: the time shown is the time used."""
    answer = client.evaluate(cw(nm, 1e-3))
    (steps,) = (s for k, level, s in levels(answer) if (k, level["limits"]) == (scheme, limits))
    assert numbers_of(steps[f"AEL_{limits}"]["text"], "at # s") == [seconds]
    assert steps["T"]["value"] == seconds


def test_emission_follows_from_the_aperture(asked: tuple) -> None:
    """The fraction inside the aperture at its distance, or at the waist where that is farther."""
    body, answer = asked
    line = body["lines"][0]
    found = {"profile": "gaussian", "level": "1/e2", "waist_m": 0.0} | line["beam"]
    found |= {f"{n}_m": found[f"{n}_mm"] * 1e-3 for n in ("diameter",)}
    one_beam = beam(found | {"divergence_rad": found["divergence_mrad"] * 1e-3})
    for scheme, level, steps in levels(answer):
        place = steps["a"]
        printed = re.fullmatch(
            rf"condition (\w+): aperture (.+) mm at ({NUMBER}) m from the exit"
            rf"(?:, the waist, which lies beyond the ({NUMBER}) m of the condition)?",
            place["text"],
        )
        assert printed, place["text"]
        assert place["value"] == pytest.approx(evaluated(printed[2]), rel=CLOSE)
        a, z = place["value"] * 1e-3, float(printed[3])
        _, tabled = measurement(scheme, int(printed[1]), line["wavelength_nm"], 1.0)
        assert z == max(tabled, found["waist_m"])
        assert (printed[4] is None) == (z == tabled)
        assert printed[4] is None or float(printed[4]) == tabled
        (energy,) = numbers_of(steps["AE"]["text"], "emission: # J")
        inside = encircled_fraction(one_beam, a, abs(z - found["waist_m"]))
        area = math.pi / 4 * a * a if level["unit"].endswith("/m2") else 1.0
        assert steps["AE"]["value"] == pytest.approx(energy * inside / area, rel=CLOSE)
        ratio = steps[f"AE / AEL_{level['limits']}"]
        assert ratio["value"] == level["ratio"]
        assert evaluated(ratio["text"]) == pytest.approx(level["ratio"], rel=CLOSE)


def test_every_step_has_a_source_or_is_computed(asked: tuple) -> None:
    _, answer = asked
    for scheme in answer["classification"]:
        for step in scheme["working"]:
            assert step["known"] in ("read", "memory", "computed", "entered")
            assert step["source"] or step["known"] == "computed", step
            assert step["text"].strip()


# Every factor of the two schemes is in one of these.
FACTORED = {
    "blue, extended": cw(440, 0.01, subtense_mrad=40),
    "near infrared": cw(1310, 0.4),
    "ultraviolet": pulse(310, 1e-5, 1e-8),
    "k1 and k2": cw(750, 1e-4),
    "k1 of a short pulse": pulse(1540, 1e-2, 1e-8),
}


@pytest.mark.parametrize("name", FACTORED)
def test_every_factor_of_a_limit_is_shown_with_its_value(client: Client, name: str) -> None:
    """A reader cannot follow 3.9e-5 x C3, or k1 x k2, without the values of the factors."""
    for scheme in client.evaluate(FACTORED[name])["classification"]:
        shown = {s["symbol"] for s in scheme["working"]}
        told = " ".join(s["text"] for s in scheme["working"])
        names = set(re.findall(r"\b(C[1-7]|T2|F_gamma|k1|k2|k1_short)\b", told))
        missing = {n for n in names - shown if not re.search(rf"\b{n} = [\d.]+", told)}
        assert not missing, (scheme["scheme"], missing)


def test_class_1c_and_the_choices_are_told(client: Client) -> None:
    iec, us = (c["remarks"] for c in client.evaluate(cw(633, 1e-3))["classification"])
    assert any("Class 1C" in text and "cannot be computed" in text for text in iec)
    assert any("3B" in text for text in iec)
    assert any("302.5 nm" in text for text in iec)
    assert any("radiance" in text for text in us)
    assert any("1 ns" in text for text in us)


# Laser, scheme, limits: where the words must stand.
MEDIUM = {
    # Table 7 and the telescope of 302.5-400 and 1400-4000 nm (from memory, medium confidence)
    "extended 3R": (cw(850, 0.01, subtense_mrad=30), IEC, "3R", "AEL_3R"),
    "ultraviolet measurement": (cw(355, 1e-4), IEC, "1", "a"),
    "infrared measurement": (cw(1550, 1e-2), IEC, "1", "a"),
    "sampling time of Class I": (cw(633, 1e-3), US, "I", "T"),
    # C5 of short pulses and more than 600 of them (4.3 f), from memory, medium confidence)
    "pulses": (train(905, 1e-7, 1e-7, 1e4), IEC, "1", "C5"),
}


@pytest.mark.parametrize("name", MEDIUM)
def test_medium_confidence_is_told(client: Client, name: str) -> None:
    body, scheme, limits, symbol = MEDIUM[name]
    found = {(k, level["limits"]): (level, s) for k, level, s in levels(client.evaluate(body))}
    level, steps = found[scheme, limits]
    if symbol == "C5":
        assert level["rule"] == "train"
    assert "medium confidence" in steps[symbol]["source"] + steps[symbol]["text"]
    if symbol.startswith("AEL_3R"):
        assert "medium confidence" in level["note"]


def test_a_class_without_limits_says_so(client: Client) -> None:
    """Class 2 has none at 1064 nm: the level shows the ratio of the limits fallen back on, and why."""
    answer = client.evaluate(cw(1064, 1e-3, profile="tophat"))
    level = answer["classification"][0]["levels"][1]
    assert level["limits"] == "2"
    # 1 mW against 0.39 x 5 mW
    assert level["ratio"] == pytest.approx(1 / 1.95, rel=1e-12)
    assert level["limit"] is level["accessible_emission"] is level["row"] is level["unit"] is None
    assert "falls back" in level["note"]


def test_two_lines_show_their_sum(client: Client) -> None:
    """0.6 mW at 532 nm and 0.9 mW at 633 nm: 1.5 of Class 2; the worst line alone is 0.9."""
    body = cw(532, 0.6e-3, profile="tophat")
    body["lines"] += cw(633, 0.9e-3, profile="tophat")["lines"]
    iec = client.evaluate(body)["classification"][0]
    level = iec["levels"][1]
    assert (level["line"], level["ratio"]) == (1, pytest.approx(1.5, rel=1e-12))
    assert level["accessible_emission"] / level["limit"] == pytest.approx(0.9, rel=1e-12)
    assert any(s["symbol"] == "sum" and s["value"] == level["ratio"] for s in iec["working"])
    assert iec["hazard_class"] == "3R"
