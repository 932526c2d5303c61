"""What must hold for every laser and every pair."""

from __future__ import annotations

import math
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.contract.answer import answer
from service.contract.protection import Protection
from service.contract.request import EvaluationRequest
from tests.assess.strategies import log, requests
from tests.assess.test_properties import scaled

EXAMPLES = settings(max_examples=100, deadline=None, derandomize=True)
ENDS = (180.0, 315.0, 400.0, 532.0, 700.0, 1064.0, 1400.0, 2000.0, 10600.0, 1e6)
MARKS = st.sampled_from(["D LB{}", "DIR LB{}", "DIRM LB{}", "IR LB{} + D LB1", "M LB{} Y", "D AB{}"])


@st.composite
def ranges(draw: st.DrawFn, marked: bool = True) -> dict[str, Any]:
    low, high = sorted(draw(st.tuples(st.sampled_from(ENDS), st.sampled_from(ENDS))))
    marking = draw(MARKS).format(draw(st.integers(1, 10))) if marked and draw(st.booleans()) else None
    found: dict[str, Any] = {"from_nm": low, "to_nm": high}
    if marking is not None:
        found["marking"] = marking
    if marking is None or draw(st.booleans()):
        found["optical_density"] = draw(st.floats(0, 15))
    return found


@st.composite
def pairs(draw: st.DrawFn, marked: bool = True) -> dict[str, Any]:
    found = draw(st.lists(ranges(marked), min_size=1, max_size=3))
    return {"name": "pair", "ranges": found}


def judged(request: EvaluationRequest, *made: dict[str, Any], lines: list[Any] | None = None) -> Protection:
    body = request.model_dump(mode="json", exclude_none=True)
    body["eyewear"] = list(made)
    if lines is not None:
        body["lines"] = [body["lines"][k] for k in lines]
    return answer(EvaluationRequest.model_validate(body)).protection


@EXAMPLES
@given(requests(), pairs(), st.floats(0, 5))
def test_more_density_never_makes_a_pair_insufficient(
    request: EvaluationRequest, made: dict[str, Any], more: float
) -> None:
    denser = {
        **made,
        "ranges": [
            {**r, "optical_density": r["optical_density"] + more} if "optical_density" in r else r
            for r in made["ranges"]
        ],
    }
    before, after = judged(request, made, denser).eyewear
    assert after.sufficient >= before.sufficient
    assert after.dense_enough >= before.dense_enough
    assert after.remaining_ratio <= before.remaining_ratio
    for a, b in zip(before.lines, after.lines, strict=True):
        assert b.enough >= a.enough


@EXAMPLES
@given(requests(), pairs(), log(1.0, 1e4))
def test_more_power_never_makes_a_pair_sufficient(
    request: EvaluationRequest, made: dict[str, Any], factor: float
) -> None:
    (less,), (more,) = judged(request, made).eyewear, judged(scaled(request, factor), made).eyewear
    assert more.sufficient <= less.sufficient
    assert more.remaining_ratio >= less.remaining_ratio * (1 - 1e-9)
    for a, b in zip(less.lines, more.lines, strict=True):
        assert b.optical_density_needed >= a.optical_density_needed - 1e-9


@EXAMPLES
@given(requests())
def test_density_and_transmittance_are_inverse_powers_of_ten(request: EvaluationRequest) -> None:
    for found in judged(request).lines:
        place = found.worst_place
        assert -math.log10(place.transmittance) == pytest.approx(place.optical_density, abs=1e-9)
        assert 0 < place.transmittance <= 1
        assert place.hazard_ratio * place.transmittance <= 1 + 1e-9
        assert place.scale_number >= place.optical_density - 1e-9
        assert place.scale_number >= max(s.scale_number_wide_beam for s in place.scale_numbers)
        for scale in place.scale_numbers:
            assert scale.scale_number_wide_beam >= scale.scale_number >= 0


@EXAMPLES
@given(requests(lines=1), pairs())
def test_behind_the_filter_is_ratio_times_transmittance(
    request: EvaluationRequest, made: dict[str, Any]
) -> None:
    """Of a marked pair at most that: the modes pass each their own share."""
    found = judged(request, made)
    (check,), (verdict,) = found.eyewear[0].lines, found.eyewear
    passed = 1.0 if check.optical_density is None else 10.0**-check.optical_density
    place = found.lines[0].worst_place
    assert check.remaining_ratio <= place.hazard_ratio * passed * (1 + 1e-9)
    if not check.modes:
        assert check.remaining_ratio == pytest.approx(place.hazard_ratio * passed, rel=1e-9)
    assert verdict.remaining_ratio == pytest.approx(check.remaining_ratio, rel=1e-9)


@EXAMPLES
@given(requests(lines=1), st.floats(-3, 3))
def test_a_density_alone_is_judged_by_the_limit(request: EvaluationRequest, off: float) -> None:
    """Above the density needed a pair will do, below it will not; what the answer says is enough."""
    needed = judged(request).lines[0].worst_place.optical_density
    stated = min(max(needed + off, 0.0), 20.0)
    nm = request.lines[0].wavelength_nm
    made = {"name": "p", "ranges": [{"from_nm": nm, "to_nm": nm, "optical_density": stated}]}
    (found,) = judged(request, made).eyewear
    if abs(stated - needed) > 1e-6 or stated == needed == 0:
        assert found.dense_enough == (stated >= needed)


@EXAMPLES
@given(requests(lines=1))
def test_the_density_that_is_asked_for_will_do(request: EvaluationRequest) -> None:
    """The density of the answer, sent back as that of a pair, protects."""
    needed = judged(request).lines[0].worst_place.optical_density
    nm = request.lines[0].wavelength_nm
    made = {"name": "p", "ranges": [{"from_nm": nm, "to_nm": nm, "optical_density": min(needed, 20.0)}]}
    (found,) = judged(request, made).eyewear
    assert found.dense_enough or needed > 20
    assert found.warnings == [] or all("together" not in w for w in found.warnings)


@EXAMPLES
@given(requests(lines=3), pairs())
def test_a_pair_that_will_do_for_all_lines_will_do_for_each(
    request: EvaluationRequest, made: dict[str, Any]
) -> None:
    (whole,) = judged(request, made).eyewear
    for k in range(len(request.lines)):
        (alone,) = judged(request, made, lines=[k]).eyewear
        assert whole.sufficient <= alone.sufficient
        assert whole.remaining_ratio >= alone.remaining_ratio * (1 - 1e-9)


@EXAMPLES
@given(requests(), st.lists(pairs(), min_size=2, max_size=5))
def test_ranks_are_a_permutation_and_pairs_do_not_disturb_each_other(
    request: EvaluationRequest, made: list[dict[str, Any]]
) -> None:
    together = judged(request, *made).eyewear
    assert sorted(p.rank for p in together) == list(range(1, len(made) + 1))
    ordered = sorted(together, key=lambda p: p.rank)
    assert [p.sufficient for p in ordered] == sorted((p.sufficient for p in together), reverse=True)
    for found, each in zip(together, made, strict=True):
        (alone,) = judged(request, each).eyewear
        assert alone.model_copy(update={"rank": found.rank}) == found
