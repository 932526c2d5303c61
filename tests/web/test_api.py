"""The contract's example in figures by hand, every field of an answer, and what the answers promise."""

from __future__ import annotations

import math
from typing import Any

import pytest

from tests.web.client import COMPARE, EVALUATE, GOOD, RULES, Client, changed, laser, strict_json

TRAIN = {"mode": "train", "pulse_s": 1e-7, "rate_hz": 5000}

#: By hand: 18 t^0.75 J/m2 for 5 us to 10 s at 400-700 nm (ICNIRP 2013), t = 0.25 s.
LIMIT_J_M2 = 18 * 0.25**0.75
#: Area of the 7 mm aperture: pi/4 x 0.007^2 = 3.8485e-5 m2.
AREA_M2 = math.pi / 4 * 0.007**2
#: 1/e diameter and divergence: the 1/e2 ones over the square root of two.
WAIST_M, ANGLE_RAD = 2e-3 / math.sqrt(2), 1e-3 / math.sqrt(2)


@pytest.fixture(scope="module")
def example(client: Client) -> dict[str, Any]:
    return client.evaluate(GOOD)


def test_example_limit(example: dict[str, Any]) -> None:
    (criterion,) = example["eye"]["criteria"]
    assert criterion["limit_j_m2"] == pytest.approx(LIMIT_J_M2, rel=1e-12)
    assert criterion["limit_j_m2"] == pytest.approx(6.36, abs=0.005)
    assert criterion["limit_w_m2"] == pytest.approx(25.456, abs=0.0005)
    assert criterion["aperture_mm"] == 7.0
    assert (criterion["rule"], criterion["tissue"], criterion["effect"]) == ("exposure", "retina", "thermal")


def test_example_ratio_and_density(example: dict[str, Any]) -> None:
    """0.1 W through 3.8485e-5 m2 is 2598.4 W/m2; over 25.456 W/m2 that is 102.1, log10 2.01."""
    # All but exp(-(7/1.414)^2) = 2e-11 of the beam passes the aperture.
    inside = 1 - math.exp(-((0.007 / WAIST_M) ** 2))
    ratio = 0.1 * 0.25 / AREA_M2 * inside / LIMIT_J_M2
    assert example["eye"]["hazard_ratio"] == pytest.approx(ratio, rel=1e-12)
    assert example["eye"]["hazard_ratio"] == pytest.approx(0.1 / 3.8485e-5 / 25.456, rel=2e-5)
    assert example["eye"]["hazard_ratio"] == pytest.approx(102.1, abs=0.05)
    assert example["eye"]["optical_density"] == pytest.approx(2.01, abs=0.005)


def test_example_distance_is_the_closed_form(example: dict[str, Any]) -> None:
    """Round Gaussian from its waist on: 1 - exp(-(a/d)^2) = 1/S, d^2 = d0^2 + (phi z)^2; a = 7 mm."""
    strength = 0.1 * 0.25 / (AREA_M2 * LIMIT_J_M2)
    # With the 1/e2 diameter D0 and angle: z = sqrt(-2 a^2 / ln(1 - 1/S) - D0^2) / phi.
    closed = math.sqrt(-2 * 0.007**2 / math.log(1 - 1 / strength) - 0.002**2) / 0.001
    assert closed == pytest.approx(99.75, abs=0.005)
    assert example["eye"]["hazard_distance_m"] == pytest.approx(closed, rel=1e-6)
    assert example["eye"]["hazard_zone_m"] == [0.0, example["eye"]["hazard_distance_m"]]


def test_example_skin_exceeds_nothing(example: dict[str, Any]) -> None:
    """11 000 t^0.25 J/m2 (ICNIRP 2013, skin), 3.5 mm aperture: a third of the limit."""
    inside = 1 - math.exp(-((3.5e-3 / WAIST_M) ** 2))
    ratio = 0.025 * inside / (math.pi / 4 * 3.5e-3**2) / (11000 * 0.25**0.25)
    skin = example["skin"]
    assert skin["hazard_ratio"] == pytest.approx(ratio, rel=1e-12)
    assert (skin["hazard_distance_m"], skin["hazard_zone_m"], skin["optical_density"]) == (0.0, None, 0.0)


NUMBER, OPTIONAL = (int, float), (int, float, type(None))
#: Every field that contract v1 shows, with its type.
FIELDS: dict[str, Any] = {
    **{f"rules.{n}": str for n in ("id", "title", "standing", "digest")},
    **{
        f"{t}.{n}": kind
        for t in ("eye", "skin")
        for n, kind in {
            "hazard_distance_m": OPTIONAL,
            "hazard_zone_m": (list, type(None)),
            "hazard_ratio": NUMBER,
            "optical_density": NUMBER,
            "governing": int,
            "criteria": list,
            "criteria.0.line": int,
            "criteria.0.limit_j_m2": NUMBER,
            "criteria.0.limit_w_m2": NUMBER,
            "criteria.0.aperture_mm": NUMBER,
            "criteria.0.hazard_ratio": NUMBER,
            "criteria.0.hazard_distance_m": OPTIONAL,
            **{f"criteria.0.{k}": str for k in ("rule", "tissue", "effect", "row")},
        }.items()
    },
    "inputs": dict,
    "working": list,
    "notices": list,
    "cautions": list,
    "cautions.0": str,
    **{f"working.0.{n}": str for n in ("symbol", "text", "unit", "source")},
    "working.0.value": OPTIONAL,
    **{f"notices.0.{n}": str for n in ("code", "field", "text")},
    **{f"provenance.{n}": str for n in ("service_version", "rules_digest", "request_digest")},
}


@pytest.mark.parametrize("path", FIELDS)
def test_every_field_of_the_contract_is_there(client: Client, path: str) -> None:
    answer: Any = client.evaluate(changed("lines.0.beam.divergence_mrad", 0.1))
    for step in path.split("."):
        answer = answer[int(step)] if isinstance(answer, list) else answer[step]
    assert isinstance(answer, FIELDS[path])
    assert not isinstance(answer, bool)


def test_digests_look_like_digests(example: dict[str, Any]) -> None:
    for digest in (example["rules"]["digest"], *list(example["provenance"].values())[1:]):
        assert len(digest.removeprefix("sha256:")) == 64


TWO = laser(532, {"mode": "cw", "power_w": 0.1})
TWO["lines"] += laser(1064, {**TRAIN, "average_power_w": 0.02}, level="1/e", waist_m=-1)["lines"]
REQUESTS = {
    "example": GOOD,
    "short": laser(532, {"mode": "cw", "power_w": 0.1}),
    "elliptical": laser(905, {**TRAIN, "energy_j": 1e-6}, diameter_mm=[1, 4], divergence_mrad=[12, 3]),
    "two lines with durations of their own": TWO,
    "with a distance": laser(308, {"mode": "cw", "power_w": 1}, viewing={"distance_m": 2}, rules=RULES[2]),
}


@pytest.mark.parametrize("body", REQUESTS.values(), ids=REQUESTS.keys())
def test_inputs_can_be_posted_back(client: Client, body: dict[str, Any]) -> None:
    first = client.evaluate(body)
    again = client.evaluate(first["inputs"])
    for part in ("rules", "eye", "skin", "inputs", "notices", "cautions", "provenance"):
        assert again[part] == first[part]


def test_inputs_hold_every_default(client: Client) -> None:
    inputs = client.evaluate(REQUESTS["short"])["inputs"]
    assert inputs == {
        "label": "",
        "rules": "icnirp-2013",
        "exposure_s": 0.25,
        "lines": [
            {
                "wavelength_nm": 532,
                "emission": {"mode": "cw", "power_w": 0.1},
                "beam": {
                    "profile": "gaussian",
                    "diameter_mm": 2,
                    "divergence_mrad": 1,
                    "level": "1/e2",
                    "diameter_at": "waist",
                    "waist_m": 0,
                },
                "subtense_mrad": 1.5,
            }
        ],
        "bench": [],
        "viewing": {},
        "eyewear": [],
        "windows": [],
    }


def test_the_digest_of_a_request_follows_its_values(client: Client) -> None:
    def digest(body: dict[str, Any]) -> str:
        return str(client.evaluate(body)["provenance"]["request_digest"])

    reordered = dict(reversed(GOOD.items()))
    assert digest(reordered) == digest(GOOD)
    assert digest(changed("lines.0.emission.power_w", 0.2)) != digest(GOOD)


PER_SECOND = {
    "cw": ({"mode": "cw", "power_w": 0.1}, {"exposure": 1 / 100}),
    "pulse": ({"mode": "pulse", "energy_j": 1e-3, "pulse_s": 1e-7}, {"single": 1 / 1e-7}),
    "train": ({**TRAIN, "energy_j": 1e-6}, dict.fromkeys(("single", "average", "train"), 5000)),
}


@pytest.mark.parametrize("mode", PER_SECOND)
def test_limit_per_area_and_second(client: Client, mode: str) -> None:
    """Contract v1: limit_j_m2 / T for cw, / pulse duration for a single pulse, x rate for a train."""
    emission, factors = PER_SECOND[mode]
    answer = client.evaluate(laser(905, emission, exposure_s=100))
    criteria = answer["eye"]["criteria"] + answer["skin"]["criteria"]
    assert {c["rule"] for c in criteria} == set(factors)
    for c in criteria:
        assert c["limit_w_m2"] == pytest.approx(c["limit_j_m2"] * factors[c["rule"]], rel=1e-12)


@pytest.mark.parametrize("body", REQUESTS.values(), ids=REQUESTS.keys())
@pytest.mark.parametrize("target", ["eye", "skin"])
def test_governing_and_density_follow_from_the_ratios(
    client: Client, body: dict[str, Any], target: str
) -> None:
    found = client.evaluate(body)[target]
    ratios = [c["hazard_ratio"] for c in found["criteria"]]
    assert ratios[found["governing"]] == max(ratios)
    assert found["hazard_ratio"] >= max(ratios) * (1 - 1e-12)
    density = max(0.0, math.log10(found["hazard_ratio"]))
    assert found["optical_density"] == pytest.approx(density, abs=1e-12)


def test_nothing_exceeded(client: Client) -> None:
    """1 uW through 7 mm is 0.026 W/m2, against 25 W/m2 for 0.25 s."""
    eye = client.evaluate(changed("lines.0.emission.power_w", 1e-6))["eye"]
    assert (eye["hazard_distance_m"], eye["hazard_zone_m"], eye["optical_density"]) == (0.0, None, 0.0)


@pytest.mark.parametrize("divergence", [0, [0, 0]])
def test_unbounded(client: Client, divergence: Any) -> None:
    """A beam that does not spread stays above its limit: null, with a notice."""
    answer = client.evaluate(changed("lines.0.beam.divergence_mrad", divergence))
    assert answer["eye"]["hazard_distance_m"] is None
    assert answer["eye"]["hazard_zone_m"] == [0.0, None]
    assert answer["eye"]["criteria"][0]["hazard_distance_m"] is None
    assert "unbounded" in [n["code"] for n in answer["notices"]]
    assert answer["skin"]["hazard_distance_m"] == 0.0


#: From durations.csv of each set: a working day in the ultraviolet, a glance in the visible, 100 s
#: beyond it (10 s in the ANSI set); a band begins with its first wavelength.
DURATIONS = [(254, 3e4), (399.9, 3e4), (400, 0.25), (699.9, 0.25), (700, 100), (1550, 100), (10600, 100)]


@pytest.mark.parametrize("rules", RULES)
@pytest.mark.parametrize(("wavelength", "seconds"), DURATIONS)
def test_conventional_duration(client: Client, rules: str, wavelength: float, seconds: float) -> None:
    if rules.startswith("ansi") and wavelength >= 700:
        seconds = 10
    answer = client.evaluate(laser(wavelength, {"mode": "cw", "power_w": 0.01}, rules=rules))
    (duration,) = answer["durations"]
    assert duration["exposure_s"] == answer["inputs"]["exposure_s"] == seconds
    assert "conventional" in duration["basis"]
    assert duration["source"]
    assert duration["known"] in ("read", "memory")


def test_chosen_duration_says_so(example: dict[str, Any]) -> None:
    (duration,) = example["durations"]
    assert duration["known"] == "entered"
    assert "chosen" in duration["basis"]


def test_each_line_has_its_own_duration(client: Client) -> None:
    answer = client.evaluate(TWO)
    assert [d["exposure_s"] for d in answer["durations"]] == [0.25, 100]
    assert answer["inputs"]["exposure_s"] is None


@pytest.mark.parametrize("body", REQUESTS.values(), ids=REQUESTS.keys())
def test_compare_is_every_single_evaluation(client: Client, body: dict[str, Any]) -> None:
    response = client.post(COMPARE, json=body)
    assert response.status_code == 200
    results = strict_json(response.text)["results"]
    assert tuple(r["rules"]["id"] for r in results) == RULES
    for rules, result in zip(RULES, results, strict=True):
        assert result == client.evaluate({**body, "rules": rules})


def test_at_a_distance(client: Client) -> None:
    """At the hazard distance itself the ratio is 1; twice as far it is about a quarter."""
    far = client.evaluate(GOOD)["eye"]["hazard_distance_m"]
    for place, ratio in ((far, 1.0), (2 * far, 0.25), (0.0, 102.08)):
        found = client.evaluate(changed("viewing", {"distance_m": place}))["eye"]["at_distance"]
        assert found["distance_m"] == place
        assert found["hazard_ratio"] == pytest.approx(ratio, rel=0.01)
    assert client.evaluate(GOOD)["eye"]["at_distance"] is None


def test_an_answer_is_the_same_twice(client: Client) -> None:
    answers = {client.post(EVALUATE, json=GOOD).content for _ in range(3)}
    assert len(answers) == 1
