"""The chart of an answer: its geometry, its read-out and its table against the answer and closed forms."""

from __future__ import annotations

import json
import math
import re
import xml.etree.ElementTree as ET
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from markupsafe import Markup

from service.contract.along import along
from service.contract.answer import answer
from service.contract.evaluation import EvaluationResult
from service.contract.request import EvaluationRequest
from service.contract.result import TargetAnswer
from service.web.axes import Axis, decades, number_runs
from service.web.chart import Chart, chart_of
from service.web.runs import Run, runs, spoken
from service.web.templates import environment
from tests.web.client import GOOD, Client, changed, laser
from tests.web.markup import shown_value
from tests.web.pages import CW, address, page
from tests.web.test_pages import FORMS, assert_figure

SVG = "{http://www.w3.org/2000/svg}"
TRAIN = {"mode": "train", "average_power_w": 0.02, "pulse_s": 1e-7, "rate_hz": 5000}
LASERS: dict[str, dict[str, Any]] = {
    "continuous": GOOD,
    "pulse train, seen at 2 m": laser(905, TRAIN, viewing={"distance_m": 2.0}),
    "waist ahead": laser(
        532, {"mode": "cw", "power_w": 0.1}, waist_m=5.0, diameter_mm=0.1, divergence_mrad=7
    ),
    "no spread": laser(532, {"mode": "cw", "power_w": 0.1}, divergence_mrad=0),
    "faint": laser(532, {"mode": "cw", "power_w": 1e-11}),
    "strong, seen at the exit": laser(1064, {"mode": "cw", "power_w": 9e4}, viewing={"distance_m": 0.0}),
    "through binoculars, behind a lens": {
        **laser(1064, {"mode": "cw", "power_w": 2.0}),
        "bench": [{"element": "lens", "focal_mm": 200}],
        "viewing": {"aid": {"objective_mm": 50, "magnification": 7}, "distance_m": 3.0, "visibility_km": 5.0},
    },
    "lit spot": {
        **laser(532, {"mode": "cw", "power_w": 20.0}),
        "bench": [{"element": "diffuser", "reflectance": 0.8}],
    },
    "sweeping beam": {
        **laser(532, {"mode": "cw", "power_w": 0.1}),
        "bench": [{"element": "scanner", "angle_deg": 20, "sweeps_hz": 50}],
    },
    "two lines": {"lines": [GOOD["lines"][0], laser(1064, {"mode": "cw", "power_w": 3.0})["lines"][0]]},
}


def drawn(body: dict[str, Any]) -> Chart:
    return chart_of(answer(EvaluationRequest.model_validate(body)))


def at_place(body: dict[str, Any], distance_m: float) -> EvaluationRequest:
    viewing = {**body.get("viewing", {}), "distance_m": distance_m}
    return EvaluationRequest.model_validate({**body, "viewing": viewing})


def targets_of(result: EvaluationResult) -> list[TargetAnswer]:
    return [t for t in (result.eye, result.skin, result.eye_aided) if t is not None]


def svg_of(chart: Chart) -> ET.Element:
    return ET.fromstring(environment().get_template("chart.svg").render(plot=chart.plot))


def test_ratio_along_the_beam_is_the_closed_form() -> None:
    """0.1 W at 532 nm: 18 t^0.75 J/m2 in 0.25 s, averaged over 7 mm (ICNIRP 2013, from memory).

    The fraction of a Gaussian beam inside the pupil is 1 - exp(-2 (a / d)^2) with the 1/e2 diameter
    d^2 = (2 mm)^2 + (1 mrad z)^2 (any optics textbook).
    """
    z = np.array([0.0, 1.0, 10.0, 50.0, 99.8, 300.0])
    d = np.hypot(2e-3, 1e-3 * z)
    area = math.pi / 4 * 7e-3**2
    expected = 0.1 * (1 - np.exp(-2 * (7e-3 / d) ** 2)) / area / (18 * 0.25**0.75 / 0.25)
    found = along(EvaluationRequest.model_validate(GOOD), z)
    assert found["eye"].hazard_ratio == pytest.approx(expected, rel=1e-9)
    assert found["eye"].limit_j_m2 == pytest.approx(np.full(6, 18 * 0.25**0.75), rel=1e-12)
    assert found["eye"].exposure_j_m2 == pytest.approx(expected * 18 * 0.25**0.75, rel=1e-9)


@pytest.mark.parametrize("body", LASERS.values(), ids=LASERS.keys())
def test_along_the_beam_equals_the_answer_at_each_distance(body: dict[str, Any]) -> None:
    # A spot is evaluated from 100 mm on.
    nearest = 0.1 if body.get("bench", [{}])[-1:] == LASERS["lit spot"]["bench"] else 0.0
    places = [nearest, 0.3, 2.0, 40.0]
    found = along(EvaluationRequest.model_validate(body), np.array(places))
    for k, place in enumerate(places):
        single = answer(at_place(body, place))
        for name, target in found.items():
            there = getattr(single, name).at_distance
            assert target.hazard_ratio[k] == pytest.approx(there.hazard_ratio, rel=1e-12)


@pytest.mark.parametrize("body", LASERS.values(), ids=LASERS.keys())
def test_drawing_is_well_formed_named_and_has_no_inline_style(body: dict[str, Any]) -> None:
    chart = drawn(body)
    root = svg_of(chart)
    title, desc = root[0], root[1]
    assert (title.tag, desc.tag) == (f"{SVG}title", f"{SVG}desc")
    assert root.attrib["aria-labelledby"].split() == [title.attrib["id"], desc.attrib["id"]]
    assert title.text == chart.plot.title
    assert all(sentence in (desc.text or "") for sentence in chart.sentences)
    for element in root.iter():
        assert "style" not in element.attrib
        assert not any(name.startswith("on") for name in element.attrib)
        assert "nan" not in element.attrib.get("d", "")


@pytest.mark.parametrize("body", LASERS.values(), ids=LASERS.keys())
def test_marks_stand_where_the_answer_says(body: dict[str, Any]) -> None:
    result = answer(EvaluationRequest.model_validate(body))
    plot = chart_of(result).plot
    for lane, target in zip(plot.zones, targets_of(result), strict=True):
        assert lane.drawn == (target.hazard_zone_m is not None)
        if target.hazard_zone_m is None:
            continue
        near, far = target.hazard_zone_m
        assert lane.open_ended == (far is None)
        assert lane.end == pytest.approx(plot.x.end if far is None else plot.x.at(far))
        assert lane.start == pytest.approx(plot.x.at(near) if near > 0.0 else plot.x.start)
        if far is not None:
            shown = "".join(run.text for run in lane.label).removesuffix(" m").rpartition(" to ")[2]
            assert float(shown_value(shown)) >= far
    there = result.eye.at_distance
    assert len(plot.marks) == (there is not None)
    if there is not None:
        at = plot.x.at(there.distance_m) if there.distance_m > 0.0 else plot.x.start
        assert plot.marks[0].at == pytest.approx(at)


def test_curve_crosses_the_limit_where_the_zone_ends() -> None:
    chart = drawn(GOOD)
    eye = next(c for c in chart.plot.curves if c.kind == "eye")
    points = [tuple(map(float, p)) for p in re.findall(r"[ML]([\d.-]+) ([\d.-]+)", eye.path)]
    assert chart.plot.limit is not None
    crossing = next(x for x, y in points if y >= chart.plot.limit)
    assert crossing == pytest.approx(chart.plot.zones[0].end, abs=3.0)


@pytest.mark.parametrize("body", LASERS.values(), ids=LASERS.keys())
def test_read_out_is_not_on_the_unsafe_side(body: dict[str, Any]) -> None:
    """What is read off the chart is the answer at that very distance, rounded up."""
    plot = drawn(body).plot
    rows = json.loads(plot.readings_json())
    assert len(rows) > 40
    assert [r[0] for r in rows] == sorted(r[0] for r in rows)
    for _, text, heights in rows[:: len(rows) // 3]:
        match = re.fullmatch(r"(\S+) m: (.+) the limit", text)
        assert match, text
        shown = [re.fullmatch(r"(?:eye|skin|aided) (.+) times", part) for part in match[2].split(", ")]
        single = targets_of(answer(at_place(body, float(match[1]))))
        for part, target in zip(shown, single, strict=True):
            assert part is not None
            assert target.at_distance is not None
            ratio = target.at_distance.hazard_ratio
            assert ratio * (1 - 1e-12) <= float(shown_value(part[1])) <= ratio * 1.0101
        assert all(h is None or plot.y.end - 1 <= h <= plot.y.start + 1 for h in heights)


@pytest.mark.parametrize("fields", FORMS.values(), ids=FORMS.keys())
def test_table_on_the_page_is_the_answer_over_distance(client: Client, fields: dict[str, str]) -> None:
    root = page(client, address(fields))
    figure = root.one("figure", class_="chart")
    assert figure.one("svg", role="img").one("title").text
    table = root.one("details", class_="chart-data").one("table")
    rows = table.one("tbody").all("tr")
    assert len(rows) >= 7
    chart = chart_of(answer(EvaluationRequest.model_validate(json.loads(root.one("pre").text))))
    for row, expected in zip(rows, chart.rows, strict=True):
        figures = row.all("data")
        values = [value for triple in expected.figures for value in triple]
        for n, (data, value) in enumerate(zip(figures, values, strict=True)):
            assert_figure(data, value, up=n % 3 != 2)


def test_viewing_distance_is_in_the_table(client: Client) -> None:
    root = page(client, address({"distance_m": "3.7", **CW}))
    (row,) = root.one("details", class_="chart-data").all("tr", class_="chosen")
    assert row.one("th").text == "3.7 viewing"
    shown = root.by_id("at-distance").all("td")[0].one("data").attributes["value"]
    assert float(row.all("data")[0].attributes["value"]) == pytest.approx(float(shown), rel=1e-12)


@settings(max_examples=200, deadline=None)
@given(st.floats(1e-12, 1e12), st.floats(1.0001, 1e20), st.floats(0.0, 1.0), st.booleans())
def test_axis_keeps_order_and_its_ends(low: float, factor: float, part: float, log: bool) -> None:
    axis = Axis(*decades(low, low * factor), 78.0, 584.0, log)
    assert axis.low <= low * (1 + 1e-8)
    assert axis.high >= low * factor * (1 - 1e-8)
    assert axis.at(axis.low) == pytest.approx(78.0)
    assert axis.at(axis.high) == pytest.approx(584.0)
    value = axis.low * (axis.high / axis.low) ** part
    assert 78.0 - 1e-6 <= axis.at(value) <= 584.0 + 1e-6
    ticks = axis.ticks()
    labelled = [t for t in ticks if t.label]
    assert 2 <= len(labelled) <= 9
    assert [t.at for t in ticks] == sorted(t.at for t in ticks)


def test_numbers_beside_an_axis() -> None:
    assert number_runs(0.001) == [Run("0.001", "")]
    assert number_runs(20000.0) == [Run("20000", "")]
    assert number_runs(1e-8) == [Run("10", ""), Run("−8", "sup")]
    assert number_runs(5e7) == [Run("5 × 10", ""), Run("7", "sup")]


def test_runs_of_a_text() -> None:
    assert runs("2 × 10⁻⁵ J/m²") == [
        Run("2 × 10", ""),
        Run("−5", "sup"),
        Run(" J/m", ""),
        Run("²", ""),
    ]
    assert runs(Markup("C<sub>A</sub> t<sup>-0.5</sup>")) == [
        Run("C", ""),
        Run("A", "sub"),
        Run(" t", ""),
        Run("-0.5", "sup"),
    ]
    assert "".join(run.text for run in runs(Markup("a &lt; b"))) == "a < b"
    assert spoken("at most 2 × 10⁻⁵ times, 3 m²") == "at most 2 × 10^−5 times, 3 m²"
    assert runs("<sup>5</sup>") == [Run("<sup>5</sup>", "")]


def test_hostile_name_stays_out_of_the_drawing() -> None:
    text = (
        environment()
        .get_template("chart.svg")
        .render(plot=drawn(changed("label", "<script>x</script>")).plot)
    )
    assert "script" not in text
