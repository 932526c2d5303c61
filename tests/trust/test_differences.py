"""Two rule sets side by side: printed limits on both sides of a step, and the known differences."""

from __future__ import annotations

import numpy as np
import pytest

from service.contract.answer import answer, rule_sets
from service.contract.differences import differences, strictest_j_m2, versus
from service.contract.request import EvaluationRequest
from tests.web.client import Client, strict_json
from tests.web.markup import parse
from tests.web.pages import HTML, page
from tests.web.shape import assert_problem

EU, ICNIRP, IEC, ANSI = "eu-2006-25", "icnirp-2013", "iec-60825-1-2014", "ansi-z136-1-2014"


@pytest.mark.parametrize(
    ("rules", "wavelength", "seconds", "printed"),
    [
        # Directive 2006/25/EC, Annex II Table 2.2 (read)
        (EU, 532, 1e-12, 1.5e-4),
        (EU, 532, 1e-8, 5e-3),
        (EU, 1064, 1e-8, 5e-2),
        # ICNIRP 2013 (from memory)
        (ICNIRP, 532, 1e-12, 1e-3),
        (ICNIRP, 532, 1e-8, 2e-3),
        (ICNIRP, 351, 3e4, 1e4),
        # IEC 60825-1:2014 Table A.1 (from memory): 10 W/m2 from 1000 s on
        (IEC, 351, 3e4, 3e5),
    ],
)
def test_strictest_limit_as_printed(rules: str, wavelength: float, seconds: float, printed: float) -> None:
    found = strictest_j_m2(rules, "eye", np.array([float(wavelength)]), np.array([seconds]), 1.5)
    assert found == pytest.approx([printed], rel=1e-12)


def test_the_same_as_a_whole_evaluation() -> None:
    """One way into the tables: the strictest criterion of an evaluated pulse, at many places."""
    wavelengths = np.array([200.0, 303.5, 350, 450, 532, 800, 1064, 1190, 1310, 1550, 2100, 10600])
    times = np.array([1e-12, 3e-10, 2e-8, 7e-6, 3e-3, 0.7])
    for key in rule_sets():
        for target in ("eye", "skin"):
            for t in times:
                found = strictest_j_m2(key, target, wavelengths, np.full(wavelengths.shape, t), 1.5)
                for w, limit in zip(wavelengths, found, strict=True):
                    line = {
                        "wavelength_nm": w,
                        "emission": {"mode": "pulse", "energy_j": 1e-3, "pulse_s": t},
                        "beam": {"diameter_mm": 1, "divergence_mrad": 1},
                    }
                    result = answer(EvaluationRequest.model_validate({"rules": key, "lines": [line]}))
                    criteria = (result.eye if target == "eye" else result.skin).criteria
                    assert limit == pytest.approx(min(c.limit_j_m2 for c in criteria), rel=1e-12), (key, w, t)


def test_both_sides_of_a_step_are_on_the_curve() -> None:
    """400 nm divides ultraviolet and visible: at 0.25 s the limit falls there (ICNIRP 2013, from memory)."""
    found = versus((ICNIRP, EU), "eye", "wavelength", (180.0, 3000.0), 0.25)
    near = np.flatnonzero(np.abs(found.x / 400.0 - 1) < 1e-8)
    assert len(near) == 2
    below, above = found.first[near]
    # 5.6e3 t^0.25 below, 18 t^0.75 above
    assert (below, above) == pytest.approx((5600 * 0.25**0.25, 18 * 0.25**0.75), rel=1e-6)


def test_a_set_does_not_differ_from_itself(client: Client) -> None:
    assert versus((EU, EU), "skin", "time", (1e-13, 3e4), 532.0).apart == 0.0
    text = page(client, f"/differences?first={EU}&second={EU}").one("main").text
    assert "The two agree at every wavelength shown." in text


def test_known_differences_differ() -> None:
    for one in differences().differences:
        assert set(one.figures) == set(rule_sets())
        assert len({round(np.log(f), 9) for f in one.figures.values()}) > 1, f"{one.id} shows no difference"


def test_page_charts_and_tables(client: Client) -> None:
    tree = page(client, f"/differences?first={ICNIRP}&second={EU}&wavelength_nm=1064&time_s=1e-8")
    assert len(tree.all("svg", role="img")) == 2
    for chart in tree.all("svg", role="img"):
        title, description = chart.one("title"), chart.one("desc")
        assert title.text
        assert "Dashed line: Directive 2006/25/EC" in description.text
    text = tree.one("main").text
    for one in differences().differences:
        assert tree.by_id(one.id)
    # 2e-2 and 5e-2 J/m2 at 1064 nm and 10 ns
    assert "Limit against wavelength at 10 ns, eye" in text


def test_every_link_to_a_chart_works(client: Client) -> None:
    tree = page(client, "/differences")
    links = [a.attributes["href"] for a in tree.all("a") if "Show it" in a.text]
    assert len(links) == len(differences().differences)
    for link in links:
        assert client.get(link, headers=HTML).status_code == 200, link


@pytest.mark.parametrize(
    ("query", "field"),
    [
        ("first=nobody", "first"),
        ("target=nose", "target"),
        ("wavelength_nm=1,064", "wavelength_nm"),
        ("wavelength_nm=179", "wavelength_nm"),
        ("time_s=inf", "time_s"),
        ("time_s=1e9", "time_s"),
        ("colour=red", "colour"),
    ],
)
def test_what_cannot_be_compared_is_named(client: Client, query: str, field: str) -> None:
    assert_problem(client.get(f"/differences?{query}"), 422, field)
    answer = client.get(f"/differences?{query}", headers=HTML)
    assert answer.status_code == 422
    parse(answer.text)


@pytest.mark.parametrize("target", ["eye", "skin"])
@pytest.mark.parametrize("wavelength", [180, 302.5, 400, 1400, 1e6])
def test_ends_of_the_tables(client: Client, target: str, wavelength: float) -> None:
    for time in ("1e-13", "30000"):
        page(client, f"/differences?second={IEC}&target={target}&wavelength_nm={wavelength}&time_s={time}")


def test_json(client: Client) -> None:
    told = strict_json(client.get("/api/v1/differences").text)["differences"]
    assert [d["id"] for d in told] == [d.id for d in differences().differences]
