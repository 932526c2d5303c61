"""The engine against a second, plain implementation written from the published numbers alone."""

from __future__ import annotations

import math

import numpy as np
import pytest

from service.assess.criteria import RULES
from service.assess.evaluate import Evaluation, evaluate
from service.assess.lines import MODES, Lines
from service.contract.answer import rule_sets
from service.optics.beams import SQRT2, Beams
from tests.reference import plain

DRAWS = 6000
ELLIPTICAL = 150


def draw(count: int, seed: int, elliptical: bool) -> list[dict]:
    """Random lines over the whole range: wavelength, time, subtense, mode, beam."""
    rng = np.random.default_rng(seed)

    def log(low: float, high: float) -> float:
        return float(10 ** rng.uniform(math.log10(low), math.log10(high)))

    lines = []
    for _ in range(count):
        mode = MODES[rng.integers(3)]
        pulse = log(1e-13, 10 if mode == "pulse" else 1.0)
        diameter, divergence = log(1e-4, 0.1), log(1e-5, 0.3)
        if elliptical:
            diameter, divergence = (diameter, log(1e-4, 0.1)), (divergence, log(1e-5, 0.3))
        lines.append(
            {
                "wavelength_nm": log(180, 1e6) if rng.random() < 0.5 else log(180, 3000),
                "mode": mode,
                "power_w": log(1e-6, 1e4),
                "energy_j": log(1e-9, 10),
                "pulse_s": pulse,
                "rate_hz": min(log(1e-2, 1e9), 1.0 / pulse),
                "exposure_s": log(1e-13, 3e4) if rng.random() < 0.3 else log(1e-4, 3e4),
                "subtense_mrad": 1.5 if rng.random() < 0.3 else log(0.5, 200),
                "profile": "gaussian" if rng.random() < 0.8 else "tophat",
                "level": "1/e" if rng.random() < 0.5 else "1/e2",
                "diameter_m": diameter,
                "divergence_rad": divergence,
                "waist_m": 0.0 if rng.random() < 0.6 else float(rng.uniform(-5, 20)),
            }
        )
    return lines


def arrays(lines: list[dict]) -> Lines:
    """The drawn lines as one batch, each a laser of its own."""

    def pair(value: float | tuple[float, float], axis: int) -> float:
        return value[axis] if isinstance(value, tuple) else value

    def column(name: str) -> np.ndarray:
        return np.array([float(line[name]) for line in lines])

    scale = np.array([SQRT2 if (x["level"] == "1/e2" and x["profile"] == "gaussian") else 1.0 for x in lines])
    axes = [
        np.array([pair(x[n], k) for x in lines]) / scale
        for n in ("diameter_m", "divergence_rad")
        for k in (0, 1)
    ]
    mode = np.array([MODES.index(x["mode"]) for x in lines])
    return Lines(
        laser=np.arange(len(lines)),
        wavelength_nm=column("wavelength_nm"),
        mode=mode,
        emitted=np.where(mode == 0, column("power_w"), column("energy_j")),
        pulse_s=np.where(mode == 0, 1.0, column("pulse_s")),
        rate_hz=np.where(mode == 2, column("rate_hz"), 1.0),
        exposure_s=column("exposure_s"),
        subtense_mrad=column("subtense_mrad"),
        beams=Beams.with_waist(
            np.array([x["profile"] == "tophat" for x in lines]),
            *axes,
            column("waist_m"),
        ),
    )


def found(evaluation: Evaluation, target: str, line: int) -> list[tuple]:
    """Criteria of one line, in an order that does not depend on the implementation."""
    result = evaluation.target(target)
    rows = evaluation.rules.rules.limits
    return sorted(
        (
            RULES[evaluation.exposures.rule[result.criteria.exposure[k]]],
            rows[result.criteria.row[k]].tissue,
            rows[result.criteria.row[k]].effect,
            float(result.criteria.limit_j_m2[k]),
            float(result.criteria.aperture_m[k]),
            float(result.hazard_ratio[k]),
            float(result.distance_m[k]),
        )
        for k in np.flatnonzero(result.criteria.line == line)
    )


@pytest.mark.parametrize("elliptical", [False, True], ids=["round", "elliptical"])
@pytest.mark.parametrize("rules", plain.RULES)
def test_engine_agrees_with_the_plain_implementation(rules: str, elliptical: bool) -> None:
    """Limits to 1e-9, distances to 1e-6, over the whole range, every rule set."""
    lines = draw(ELLIPTICAL if elliptical else DRAWS, seed=2013 + elliptical, elliptical=elliptical)
    evaluation = evaluate(arrays(lines), rule_sets()[rules])
    for k, line in enumerate(lines):
        expected = plain.evaluate(rules, line)
        for target in ("eye", "skin"):
            result, plainly = evaluation.target(target), expected[target]
            theirs = sorted(
                (
                    c["rule"],
                    c["tissue"],
                    c["effect"],
                    c["limit_j_m2"],
                    c["aperture_m"],
                    c["hazard_ratio"],
                    c["hazard_distance_m"],
                )
                for c in plainly["criteria"]
            )
            ours = found(evaluation, target, k)
            assert [c[:3] for c in ours] == [c[:3] for c in theirs], (rules, target, line)
            for mine, other in zip(ours, theirs, strict=True):
                assert mine[3] == pytest.approx(other[3], rel=1e-9), (rules, target, line)
                assert mine[4] == pytest.approx(other[4], rel=1e-9), (rules, target, line)
                assert mine[5] == pytest.approx(other[5], rel=1e-6), (rules, target, line)
                assert mine[6] == pytest.approx(other[6], rel=1e-6, abs=1e-9), (rules, target, line)
            assert result.worst_ratio[k] == pytest.approx(plainly["hazard_ratio"], rel=1e-6)
            assert result.far_m[k] == pytest.approx(plainly["hazard_distance_m"], rel=1e-6, abs=1e-9)
            zone = plainly["hazard_zone_m"] or (0.0, 0.0)
            assert result.near_m[k] == pytest.approx(zone[0], rel=1e-6, abs=1e-9), (rules, target, line)
