"""The class engine against the plain implementation of the two schemes, written from the printed numbers.

They differ on purpose in three things, which are applied to the plain answer here:

- the product lets no class but the last exceed the limits of 3B (IIIb) under any condition: without this a
  continuous beam of 50 W at 1350 nm would be Class 3R (C7 has grown to 10^4 there);
- the plain code numbers the one condition of 21 CFR 1040.10 1, the product names it 3;
- where no line of a laser has a condition 1 the plain ratio under it is 0, the product repeats that of
  condition 3: neither decides anything then.
"""

from __future__ import annotations

from collections import Counter

import numpy as np
import pytest

from service.assess.classification import Classification, classify
from tests.assess.class_lasers import batch, lasers
from tests.reference import plain_classes
from tests.rules.class_engine import IEC, SCHEMES, US, compiled

ROUND, ELLIPTICAL = 20_000, 500
CLASSES = {
    IEC: ("1", "1M", "2", "2M", "3R", "3B", "4"),
    US: ("I", "IIa", "II", "IIIa", "IIIb", "IV"),
}
CEILING = {IEC: "3B", US: "IIIb"}


def plain_class(scheme: str, answer: dict) -> str:
    """The plain class, with the ceiling of the product."""
    limit = CEILING[scheme]
    over = any(r > 1 for (limits, _), r in answer["ratios"].items() if limits == limit)
    return CLASSES[scheme][-1] if over else answer["class"]


def compare(scheme: str, several: list[list[dict]], result: Classification, rel: float) -> Counter[str]:
    """Classes and ratios of all lasers agree; how many lasers are in each class."""
    ours = {(c, k): r for c, ratios in result.ratio.items() for k, r in ratios.items()}
    seen: Counter[str] = Counter()
    for n, lines in enumerate(several):
        answer = plain_classes.classify(scheme, lines)
        aided = any(plain_classes.has_condition_1(line["wavelength_nm"]) for line in lines)
        for (limits, condition), ratio in answer["ratios"].items():
            name = str(condition) if scheme == IEC else "3"
            if name == "1" and not aided:
                assert ours[limits, "1"][n] == ours[limits, "3"][n]
                continue
            found = ours[limits, name][n]
            assert found == pytest.approx(ratio, rel=rel, abs=0), (scheme, limits, name, lines)
        expected = plain_class(scheme, answer)
        assert CLASSES[scheme][result.number[n]] == expected, (scheme, answer, lines)
        seen[expected] += 1
    return seen


@pytest.mark.parametrize("scheme", SCHEMES)
def test_round_beams(scheme: str) -> None:
    """20 000 lasers, every class and every limit row among them: classes and ratios agree to 1e-9."""
    several = lasers(ROUND, seed=60825)
    result = classify(batch(several), compiled(scheme))
    seen = compare(scheme, several, result, 1e-9)
    assert set(seen) == set(CLASSES[scheme]), seen
    used = {int(k) for table in result.limits.values() for k in table.row}
    assert len(used) == len(compiled(scheme).scheme.limits), "a limit row decides nothing here"
    assert min(seen.values()) >= 20, seen


@pytest.mark.parametrize("scheme", SCHEMES)
def test_elliptical_beams(scheme: str) -> None:
    """The fraction through the aperture is a sum in both implementations: 1e-6."""
    several = lasers(ELLIPTICAL, seed=1040, elliptical=True)
    compare(scheme, several, classify(batch(several), compiled(scheme)), 1e-6)


def test_the_sample_is_as_wide_as_it_says() -> None:
    several = lasers(ROUND, seed=60825)
    lines = [line for laser in several for line in laser]
    wavelength = np.array([line["wavelength_nm"] for line in lines])
    assert wavelength.min() < 200
    assert wavelength.max() > 5e5
    assert {line["mode"] for line in lines} == {"cw", "pulse", "train"}
    assert {line["profile"] for line in lines} == {"gaussian", "tophat"}
    alpha = np.array([line["subtense_mrad"] for line in lines])
    assert (alpha.min() < 0.6, alpha.max() > 190) == (True, True)
    assert 0.08 < sum(len(laser) > 1 for laser in several) / len(several) < 0.12


def test_the_ceiling_is_what_makes_1350_nm_class_4() -> None:
    """50 W at 1350 nm: 2e-3 C4 C7 W is 100 W (IEC Table 6), while Class 3B ends at 0.5 W (Table 8)."""
    line = {
        "wavelength_nm": 1350.0, "mode": "cw", "power_w": 50.0, "energy_j": 1.0, "pulse_s": 1.0,
        "rate_hz": 1.0, "exposure_s": 1.0, "subtense_mrad": 1.5, "profile": "tophat", "level": "1/e",
        "diameter_m": 1e-3, "divergence_rad": 1e-4, "waist_m": 0.0,
    }  # fmt: skip
    answer = plain_classes.classify(IEC, [line])
    assert (answer["class"], plain_class(IEC, answer)) == ("3R", "4")
    result = classify(batch([[line]]), compiled(IEC))
    assert CLASSES[IEC][result.number[0]] == "4"
