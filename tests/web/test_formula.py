"""Formulas as people read them; text stays text."""

from __future__ import annotations

import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.web.formula import formula, power_of_ten
from tests.web.client import RULES, Client, laser
from tests.web.markup import parse

TYPESET = {
    "C_A": "C<sub>A</sub>",
    "C_A x C_E": "C<sub>A</sub> × C<sub>E</sub>",
    "18 x t^0.75 x C_E": "18 × t<sup>0.75</sup> × C<sub>E</sub>",
    "T2^-0.25": "T2<sup>−0.25</sup>",
    "10^(0.002 x (905 - 700))": "10<sup>0.002 × (905 − 700)</sup>",
    "3e+10": "3 × 10<sup>10</sup>",
    "1e-09": "10<sup>−9</sup>",
    "5e-06^0.75": "(5 × 10<sup>−6</sup>)<sup>0.75</sup>",
    "(alpha / gamma)^2": "(α / γ)<sup>2</sup>",
    "alpha^2 / (alpha_min alpha_max)": "α<sup>2</sup> / (α<sub>min</sub> α<sub>max</sub>)",
    "lambda": "λ",
    "H / H_MPE": "H / H<sub>MPE</sub>",
    "z_near": "z<sub>near</sub>",
    "N^-0.25, at least 0.4": "N<sup>−0.25</sup>, at least 0.4",
    "log10(102.077)": "log10(102.077)",
    "row eye-vis-5us-10s": "row eye-vis-5us-10s",
    "": "",
}


@pytest.mark.parametrize(("text", "markup"), TYPESET.items())
def test_typeset(text: str, markup: str) -> None:
    assert str(formula(text)) == markup


@pytest.mark.parametrize(
    ("text", "markup"),
    [("3e+10 s", "3 × 10<sup>10</sup> s"), ("1e-13 to 1e-09 s", "10<sup>−13</sup> to 10<sup>−9</sup> s")],
)
def test_power_of_ten(text: str, markup: str) -> None:
    assert str(power_of_ten(text)) == markup


HOSTILE = [
    "<script>alert(1)</script>",
    '"><img src=x onerror=alert(1)>',
    "a^<b>",
    "a^(<i>)",
    "C_<b>",
    "&lt;^&amp;",
]


@pytest.mark.parametrize("text", HOSTILE)
def test_markup_in_the_text_is_escaped(text: str) -> None:
    tags = set(re.findall(r"</?([a-z]+)", str(formula(text))))
    assert tags <= {"sup", "sub"}


@given(st.text(alphabet=st.sampled_from("<>&\"'^()_ abCTHxe0123456789.-+"), max_size=40))
def test_only_sub_and_sup_ever_appear(text: str) -> None:
    root = parse(f"<p>{formula(text)}</p>")
    assert {e.tag for e in root.walk()} <= {"page", "p", "sub", "sup"}


@given(st.text(max_size=60))
def test_any_text_can_be_typeset(text: str) -> None:
    assert "<script" not in str(formula(text))


@pytest.mark.parametrize("rules", RULES)
def test_no_raw_notation_is_left_in_a_working(client: Client, rules: str) -> None:
    """What the service prints itself is typeset whole: no ^, no index with a low line."""
    emission = {"mode": "train", "energy_j": 1e-6, "pulse_s": 1e-9, "rate_hz": 1e6}
    for body in (laser(905, emission, rules=rules), laser(470, emission, rules=rules, subtense_mrad=20)):
        for step in client.evaluate(body)["working"]:
            for text in (step["symbol"], step["text"]):
                assert "^" not in formula(text)
                assert not re.search(r"\w_\w", str(formula(text))), text
