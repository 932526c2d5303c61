"""What must hold for the class of every laser, under both schemes."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.assess.classification import UNAIDED, Classification, classify
from service.assess.lines import Lines
from service.contract.answer import rule_sets
from service.contract.convert import lines_of
from service.contract.request import EvaluationRequest
from tests.assess.class_lasers import batch, lasers
from tests.assess.strategies import requests
from tests.rules.class_engine import IEC, SCHEMES, US, compiled

EXAMPLES = settings(max_examples=100, deadline=None, derandomize=True)
scheme_ids = st.sampled_from(SCHEMES)


def lines(*several: EvaluationRequest) -> Lines:
    return lines_of(several, next(iter(rule_sets().values())))[0]


def of(scheme: str, *several: EvaluationRequest) -> Classification:
    return classify(lines(*several), compiled(scheme))


@EXAMPLES
@given(requests(), st.floats(1.0, 1e6), scheme_ids)
def test_more_power_never_lowers_the_class(request: EvaluationRequest, factor: float, scheme: str) -> None:
    less = lines(request)
    more = replace(less, emitted=less.emitted * factor)
    a, b = classify(less, compiled(scheme)), classify(more, compiled(scheme))
    assert b.number[0] >= a.number[0]
    for limits, ratios in a.ratio.items():
        for condition, ratio in ratios.items():
            assert b.ratio[limits][condition] == pytest.approx(ratio * factor, rel=1e-9)


@pytest.mark.parametrize("scheme", SCHEMES)
def test_the_class_climbs_from_the_first_to_the_last(scheme: str) -> None:
    """Each of 2000 lasers from 1e-25 to 1e25 of its power: the first class, the last, and no step back."""
    several = batch(lasers(2000, seed=7))
    before = np.zeros(several.lasers, dtype=np.intp)
    seen = set()
    for factor in np.logspace(-25, 25, 151):
        now = classify(replace(several, emitted=several.emitted * factor), compiled(scheme)).number
        assert (now >= before).all()
        seen |= set(now.tolist())
        if factor == 1e-25:
            assert (now == 0).all()
        before = now
    last = len(compiled(scheme).scheme.classes) - 1
    assert (before == last).all()
    assert seen == set(range(last + 1))


@EXAMPLES
@given(st.lists(requests(), min_size=2, max_size=6), scheme_ids)
def test_a_batch_equals_its_single_parts(several: list[EvaluationRequest], scheme: str) -> None:
    """n lasers in one batch give bit for bit what n batches of one give."""
    together = of(scheme, *several)
    for number, request in enumerate(several):
        alone = of(scheme, request)
        assert alone.number[0] == together.number[number]
        for limits, ratios in alone.ratio.items():
            for condition, ratio in ratios.items():
                assert ratio[0] == together.ratio[limits][condition][number], (limits, condition)


@EXAMPLES
@given(requests(), scheme_ids)
def test_a_laser_keeps_the_limits_of_its_class(request: EvaluationRequest, scheme: str) -> None:
    """Within its own limits, within the ceiling, and beyond the limits of every class passed over."""
    result = of(scheme, request)
    published = compiled(scheme).scheme
    rule = published.classes[result.number[0]]
    ceiling = max(r[0] for r in result.ratio[published.ceiling].values())
    if rule.limits is None:
        assert ceiling > 1
        return
    assert ceiling <= 1
    ratios = result.ratio[rule.limits]
    assert ratios[UNAIDED][0] <= 1
    for condition, ratio in ratios.items():
        bound = ratio if rule.aided_limits is None else result.ratio[rule.aided_limits][condition]
        assert bound[0] <= 1
    for lower in published.classes[: result.number[0]]:
        assert lower.limits is not None
        if lower.wavelength_nm is None:
            assert max(r[0] for r in result.ratio[lower.limits].values()) > 1


@EXAMPLES
@given(requests(lines=1), scheme_ids)
def test_two_like_lines_are_in_no_lower_class_than_one(request: EvaluationRequest, scheme: str) -> None:
    double = request.model_copy(update={"lines": [*request.lines, *request.lines]})
    one, two = of(scheme, request), of(scheme, double)
    assert two.number[0] >= one.number[0]
    for limits, ratios in one.ratio.items():
        for condition, ratio in ratios.items():
            assert two.ratio[limits][condition] == pytest.approx(2 * ratio, rel=1e-12)


@EXAMPLES
@given(requests(lines=3), requests(lines=1), scheme_ids)
def test_another_line_never_lowers_the_class(
    request: EvaluationRequest, more: EvaluationRequest, scheme: str
) -> None:
    """Every limit is judged with all lines; a class that opens by wavelength costs no more than before."""
    both = request.model_copy(update={"lines": [*request.lines, *more.lines]})
    alone, together = of(scheme, request), of(scheme, both)
    assert together.number[0] >= alone.number[0]


@EXAMPLES
@given(requests(lines=3))
def test_the_order_of_lines_decides_nothing(request: EvaluationRequest) -> None:
    turned = request.model_copy(update={"lines": request.lines[::-1]})
    for scheme in SCHEMES:
        assert of(scheme, request).number[0] == of(scheme, turned).number[0]


@EXAMPLES
@given(requests(lines=1), st.floats(1e-9, 3e4))
def test_the_exposure_duration_of_a_request_decides_nothing(request: EvaluationRequest, t: float) -> None:
    """A class rests on time bases of its own, not on how long someone looks."""
    other = request.model_copy(update={"exposure_s": t})
    for scheme in SCHEMES:
        a, b = of(scheme, request), of(scheme, other)
        assert a.number[0] == b.number[0]
        assert all(np.array_equal(r, b.ratio[c][k]) for c, s in a.ratio.items() for k, r in s.items())


@EXAMPLES
@given(requests(lines=2))
def test_classes_are_tied_to_their_wavelengths(request: EvaluationRequest) -> None:
    """1M: 302.5-4000 nm; 2 and 2M: 400-700 nm; IIa, II and IIIa: 400-710 nm (from memory)."""
    bands = {"1M": (302.5, 4000), "2": (400, 700), "2M": (400, 700)} | dict.fromkeys(
        ("IIa", "II", "IIIa"), (400, 710)
    )
    for scheme in (IEC, US):
        number = of(scheme, request).number[0]
        low, high = bands.get(compiled(scheme).scheme.classes[number].name, (180, 1e6 + 1))
        assert any(low <= line.wavelength_nm < high for line in request.lines)
