"""Columns in, columns out: every figure is that of the single answer, bit for bit."""

from __future__ import annotations

import doctest
import math
from typing import Any

import numpy as np
import pytest

from service import columns as columns_module
from service.bulk.flat import UnknownColumn
from service.columns import COLUMNS, evaluate_columns
from service.contract.answer import answer
from service.contract.problem import Problem
from service.contract.reading import request_of
from tests.web.client import RULES
from tests.web.test_random_requests import requests

FLOATS = ("hazard_ratio", "optical_density")


def flat(body: dict[str, Any]) -> dict[str, Any]:
    """The row of a request with one line."""
    (line,) = body["lines"]
    row = {"rules": body["rules"], "exposure_s": body.get("exposure_s")}
    row["distance_m"] = body.get("viewing", {}).get("distance_m")
    row |= {name: line[name] for name in ("wavelength_nm", "subtense_mrad")}
    row |= line["emission"]
    for name, value in line["beam"].items():
        if isinstance(value, list):
            row[name], row[name.replace("_m", "_y_m")] = value
        else:
            row[name] = value
    return row


def table(rows: list[dict[str, Any]]) -> dict[str, list[Any]]:
    names = dict.fromkeys(name for row in rows for name in row)
    return {name: [row.get(name) for row in rows] for name in names}


@pytest.fixture(scope="module")
def bodies() -> list[dict[str, Any]]:
    """Random lasers of one line, the diameter of some at the exit; some of them cannot be used."""
    found = []
    for k, body in enumerate(requests(23)):
        one = {**body, "lines": body["lines"][:1]}
        if k % 5:
            one.pop("viewing", None)
        if k % 3 == 0:
            one["lines"][0]["beam"]["diameter_at"] = "exit"
        found.append(one)
    return found


def assert_same(found: dict[str, np.ndarray], k: int, body: dict[str, Any]) -> None:
    """Row k of the columns is the answer, or the problem, of the single request."""
    try:
        result = answer(request_of(body))
    except Problem as refused:
        problem = refused.detail
    else:
        problem = ""
    if problem:
        assert found["problem"][k].startswith(problem)
        assert np.isnan(found["eye_hazard_distance_m"][k])
        return
    assert found["problem"][k] == ""
    assert found["rules_digest"][k] == result.rules.digest
    assert found["worst_optical_density"][k] == result.eye.optical_density
    for target in ("eye", "skin"):
        whole = getattr(result, target)
        far = math.inf if whole.hazard_distance_m is None else whole.hazard_distance_m
        assert found[f"{target}_hazard_distance_m"][k] == far
        assert found[f"worst_{target}_hazard_distance_m"][k] == far
        near = 0.0 if whole.hazard_zone_m is None else whole.hazard_zone_m[0]
        assert found[f"{target}_hazard_from_m"][k] == near
        for name in FLOATS:
            assert found[f"{target}_{name}"][k] == getattr(whole, name)
        there = [found[f"{target}_{name}_at_distance"][k] for name in ("ratio", "density")]
        if whole.at_distance is None:
            assert np.isnan(there).all()
        else:
            assert there == [whole.at_distance.hazard_ratio, whole.at_distance.optical_density]
        for name in ("line", "rule", "tissue", "effect", "row"):
            assert found[f"{target}_{name}"][k] == getattr(whole.criteria[whole.governing], name)
    classes = [found["class_iec_60825_1_2014"][k], found["class_us_21cfr1040"][k]]
    assert classes == [c.hazard_class for c in result.classification]


def test_columns_equal_single_answers(bodies: list[dict[str, Any]]) -> None:
    found = evaluate_columns(table([flat(body) for body in bodies]))
    for k, body in enumerate(bodies):
        assert_same(found, k, body)
    assert (found["problem"] == "").sum() > 200
    assert not any(found["notices"])


def test_notices_are_listed_where_wanted(bodies: list[dict[str, Any]]) -> None:
    rows = table([flat(body) for body in bodies[:60]])
    plain, told = evaluate_columns(rows), evaluate_columns(rows, notices=True)
    for name, column in plain.items():
        if name != "notices":
            np.testing.assert_array_equal(column, told[name])
    for k, body in enumerate(bodies[:60]):
        if not told["problem"][k]:
            codes = [n.code for n in answer(request_of(body)).notices]
            assert told["notices"][k].split() == list(dict.fromkeys(codes))


BASE = {"wavelength_nm": 532.0, "mode": "cw", "power_w": 0.1, "diameter_mm": 2.0, "divergence_mrad": 1.0}


@pytest.mark.parametrize(
    ("change", "field"),
    [
        ({"wavelength_nm": 179.9}, "lines.0.wavelength_nm"),
        ({"wavelength_nm": None}, "lines.0.wavelength_nm"),
        ({"wavelength_nm": "532"}, "lines.0.wavelength_nm"),
        ({"wavelength_nm": math.inf}, "lines.0.wavelength_nm"),
        ({"wavelength_nm": True}, "lines.0.wavelength_nm"),
        ({"mode": "CW"}, "lines.0.emission"),
        ({"mode": None}, "lines.0.emission"),
        ({"power_w": 0.0}, "lines.0.emission.power_w"),
        ({"power_w": None}, "lines.0.emission.power_w"),
        ({"pulse_s": 1e-9}, "lines.0.emission.pulse_s"),
        ({"mode": "pulse", "power_w": None, "energy_j": 1e-3}, "lines.0.emission.pulse_s"),
        ({"mode": "train", "power_w": None, "pulse_s": 1e-9, "rate_hz": 10.0}, "lines.0.emission"),
        (
            {
                "mode": "train",
                "power_w": None,
                "pulse_s": 1e-9,
                "rate_hz": 1e-6,
                "average_power_w": 1e12,
            },
            "lines.0.emission",
        ),
        ({"diameter_mm": 1e-5}, "lines.0.beam.diameter_mm"),
        ({"diameter_mm": None}, "lines.0.beam.diameter_mm"),
        ({"divergence_mrad": -1.0}, "lines.0.beam.divergence_mrad"),
        ({"divergence_mrad": 1e-7}, "lines.0.beam.divergence_mrad"),
        ({"divergence_y_mrad": 4000.0}, "lines.0.beam.divergence_mrad.1"),
        ({"level": "1/e3"}, "lines.0.beam.level"),
        ({"profile": "fibre"}, "lines.0.beam.profile"),
        ({"exposure_s": 4e4}, "exposure_s"),
        ({"subtense_mrad": -1.0}, "lines.0.subtense_mrad"),
        ({"waist_m": 2e6}, "lines.0.beam.waist_m"),
        ({"distance_m": -1.0}, "viewing.distance_m"),
        ({"diameter_at": "exit", "waist_m": 5.0}, "lines.0.beam.diameter_mm"),
        ({"rules": "none-such"}, "rules"),
    ],
    ids=str,
)
def test_a_row_that_cannot_be_used_says_why(change: dict[str, Any], field: str) -> None:
    """The rows around it are evaluated; the reason is that of the API."""
    found = evaluate_columns(table([BASE, {**BASE, **change}, BASE]))
    assert found["problem"][1].startswith(field)
    assert "allowed: " in found["problem"][1]
    for name, column in found.items():
        np.testing.assert_equal(column[0], column[2])
        if column.dtype.kind == "f":
            assert np.isnan(column[1]), name
            assert np.isfinite(column[0]) or name.endswith("at_distance"), name
    assert found["eye_row"].tolist() == ["eye-vis-5us-10s", "", "eye-vis-5us-10s"]


def test_single_values_hold_for_every_row_and_defaults_are_those_of_the_api() -> None:
    power = np.geomspace(1e-3, 1.0, 7)
    found = evaluate_columns({**BASE, "power_w": power, "label": "sweep"})
    for k in range(7):
        line = {
            "wavelength_nm": 532,
            "emission": {"mode": "cw", "power_w": power[k].item()},
            "beam": {"diameter_mm": 2.0, "divergence_mrad": 1.0},
        }
        assert_same(found, k, {"lines": [line]})
    assert set(found["label"]) == {"sweep"}
    assert (np.diff(found["eye_hazard_ratio"]) > 0).all()


def test_a_data_frame_is_a_table() -> None:
    """Anything with column names and columns by name: no data frame library is needed here."""

    class Frame:
        def __init__(self, columns: dict[str, Any]) -> None:
            self.columns = columns

        def keys(self) -> list[str]:
            return list(self.columns)

        def __getitem__(self, name: str) -> Any:
            return self.columns[name]

    rows = {name: [value] * 3 for name, value in BASE.items()}
    expected, found = evaluate_columns(rows), evaluate_columns(Frame(rows))  # type: ignore[arg-type]
    for name in expected:
        np.testing.assert_array_equal(expected[name], found[name])


@pytest.mark.parametrize("rules", RULES)
def test_whole_numbers_and_small_floats_are_numbers(rules: str) -> None:
    columns = {**BASE, "wavelength_nm": np.array([532, 1064], dtype=np.int32), "rules": rules}
    columns["power_w"] = np.array([0.5, 0.25], dtype=np.float32)
    found = evaluate_columns(columns)
    exact = evaluate_columns({**columns, "wavelength_nm": [532.0, 1064.0], "power_w": [0.5, 0.25]})
    for name in found:
        np.testing.assert_array_equal(found[name], exact[name])


def test_names_and_lengths_are_checked() -> None:
    with pytest.raises(UnknownColumn, match=r"unknown column 'power_mw'.*power_w"):
        evaluate_columns({**BASE, "power_mw": 100})
    with pytest.raises(ValueError, match="one length"):
        evaluate_columns({**BASE, "power_w": [1.0, 2.0], "wavelength_nm": [532.0] * 3})
    with pytest.raises(ValueError, match="one-dimensional"):
        evaluate_columns({**BASE, "power_w": np.ones((2, 2))})


def test_no_row_is_no_answer() -> None:
    found = evaluate_columns({name: [] for name in COLUMNS})
    assert all(len(column) == 0 for column in found.values())


def test_the_example_of_the_module_holds() -> None:
    tried = doctest.testmod(columns_module)
    assert tried.attempted > 3
    assert tried.failed == 0
