"""Tolerances to answers: nominal, worst case and distribution, all through the one engine."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from service import __version__
from service.assess.corners import CORNERS, breaks, corner_values, direction
from service.assess.lines import Lines
from service.assess.spread import Knob, Nominal, Outcomes, outcomes
from service.contract.answer import cautions, rule_set
from service.contract.beam_only import evaluation_notices
from service.contract.classification import schemes
from service.contract.convert import behind_bench, lines_of
from service.contract.result import Notice
from service.contract.tolerance import (
    Chance,
    Distribution,
    Figures,
    Histogram,
    Influence,
    ToleranceRequest,
    ToleranceResult,
    WorstCase,
)
from service.contract.tolerance_fields import (
    Spread,
    corners_at_most,
    draws_of,
    nominal_lines,
    set_field,
    spreads,
)
from service.rules.compiled import CompiledRules

__all__ = ["draw_values", "tolerance"]

Floats = NDArray[np.float64]
Turned = Mapping[Knob, Floats]

BINS = 40
COVERAGE = (0.025, 0.975)
JUDGED = 3.0
#: Figures of a distribution: name in the answer, how to get them.
SHOWN: dict[str, Callable[[Outcomes], Floats]] = {
    "eye_hazard_distance_m": lambda o: o.eye_distance_m,
    "eye_hazard_ratio": lambda o: o.eye_ratio,
    "eye_optical_density": lambda o: o.eye_density,
    "skin_hazard_distance_m": lambda o: o.skin_distance_m,
    "skin_hazard_ratio": lambda o: o.skin_ratio,
    "skin_optical_density": lambda o: o.skin_density,
}


class _Judge:
    """The evaluation of a request for any values of its figures."""

    def __init__(self, request: ToleranceRequest) -> None:
        self.rules: CompiledRules = rule_set(request.evaluation.rules)
        self.lines: Lines
        self.lines, rows = lines_of([request.evaluation], self.rules)
        self.behind: Lines
        with np.errstate(over="ignore", under="ignore"):
            self.behind = behind_bench([request.evaluation], self.lines)
        self.by_convention = rows >= 0
        self.nominal: Sequence[Nominal] = nominal_lines(request.evaluation)
        self.schemes = schemes()

    def __call__(self, turned: Turned) -> Outcomes:
        return outcomes(
            self.lines, self.behind, self.nominal, turned, self.rules, self.schemes, self.by_convention
        )

    def figures(self, found: Outcomes, k: int) -> dict[str, Any]:
        """The fields of `Figures` for one laser."""
        shown = {name: _finite(float(of(found)[k])) for name, of in SHOWN.items()}
        return {**shown, "classes": {key: self.name(key, int(n[k])) for key, n in found.classes.items()}}

    def name(self, scheme: str, number: int) -> str:
        """Name of a class."""
        return self.schemes[scheme].scheme.classes[number].name


def _finite(value: float) -> float | None:
    return value if np.isfinite(value) else None


def _turn(found: Sequence[Spread], values: Mapping[str, Floats]) -> dict[Knob, Floats]:
    """Values by field as values by figure."""
    return {knob: values[s.field] * ratio for s in found for knob, ratio in s.knobs}


def draw_values(found: Sequence[Spread], draws: int, seed: int) -> dict[str, Floats]:
    """Independent draws of every field, the same for the same seed.

    Normal values beyond three standard deviations are drawn again.
    """
    generator = np.random.default_rng(seed)
    values = {}
    for spread in found:
        if spread.deviation == 0.0:
            drawn = generator.uniform(spread.low, spread.high, draws)
        else:
            standard = generator.standard_normal(draws)
            while (far := np.flatnonzero(np.abs(standard) > JUDGED)).size:
                standard[far] = generator.standard_normal(far.size)
            drawn = spread.centre + spread.deviation * standard
        values[spread.field] = np.clip(drawn, spread.low, spread.high)
    return values


def tolerance(request: ToleranceRequest) -> ToleranceResult:
    """Judge an evaluation with tolerances. Raises InvalidRequest where one cannot be used."""
    found = spreads(request)
    judge = _Judge(request)
    nominal = judge(_turn(found, {s.field: np.array([s.value]) for s in found}))
    draws = draws_of(request, judge.behind)
    request = request.model_copy(update={"draws": draws})
    values = draw_values(found, draws, request.seed)
    drawn = judge(_turn(found, values))
    ranked_by = "eye_hazard_distance_m" if np.ptp(_ordered(drawn.eye_distance_m)) else "eye_hazard_ratio"
    return ToleranceResult(
        nominal=Figures(**judge.figures(nominal, 0)),
        worst_case=_worst(request, judge, found, [(values, drawn), _corners(request, judge, found)]),
        distributions=[_distribution(name, of(drawn)) for name, of in SHOWN.items()],
        classes=[
            Chance(scheme=key, hazard_class=judge.name(key, number), share=float((n == number).mean()))
            for key, n in drawn.classes.items()
            for number in np.unique(n).tolist()
        ],
        influence=_influence(judge, found, values, SHOWN[ranked_by](drawn)),
        ranked_by=ranked_by,
        inputs=request.model_dump(mode="json", exclude_none=True),
        notices=[
            *evaluation_notices(request.evaluation, judge.lines.exposure_s.tolist()),
            *_notices(found, drawn),
        ],
        cautions=cautions(),
        service_version=__version__,
        rules_digest=judge.rules.rules.digest,
    )


def _ordered(values: Floats) -> Floats:
    """Values with infinity as a number beyond all others, so that they can be compared and ranked."""
    return np.where(np.isfinite(values), values, 1e300)


def _corners(
    request: ToleranceRequest, judge: _Judge, found: Sequence[Spread]
) -> tuple[dict[str, Floats], Outcomes]:
    """The corners of the box, judged."""
    boxes = {knob: (s.low * r, s.value * r, s.high * r) for s in found for knob, r in s.knobs[:1]}
    sets = [judge.rules.rules, *(c.scheme for c in judge.schemes.values())]
    printed = {v: breaks(sets, v) for v in ("wavelength_nm", "time_s", "subtense_mrad")}
    most = corners_at_most(request, judge.behind, CORNERS)
    turned = corner_values(boxes, judge.nominal, printed, request.seed, most)
    values = {s.field: turned[s.knobs[0][0]] for s in found}
    return values, judge(_turn(found, values))


def _worst(
    request: ToleranceRequest,
    judge: _Judge,
    found: Sequence[Spread],
    judged: Sequence[tuple[dict[str, Floats], Outcomes]],
) -> WorstCase:
    """The worst of corners and draws, each figure for itself."""
    worst: dict[str, Any] = {
        name: _finite(float(max(of(o).max() for _, o in judged))) for name, of in SHOWN.items()
    }
    classes = {
        key: judge.name(key, int(max(o.classes[key].max() for _, o in judged))) for key in judge.schemes
    }
    # Corners first: where a draw is no worse the corner is told.
    values, top = max(
        reversed(judged), key=lambda part: (part[1].eye_distance_m.max(), part[1].eye_ratio.max())
    )
    k = int(np.lexsort((top.eye_ratio, top.eye_distance_m))[-1])
    at = {s.field: float(values[s.field][k]) for s in found}
    body = request.evaluation.model_dump(mode="json", exclude_unset=True)
    body.setdefault("label", "")
    for field, value in at.items():
        if field == "exposure_s" or field.endswith(("waist_m", "subtense_mrad")):
            _deepen(body, field)
        set_field(body, field, value)
    knobs = [knob for s in found for knob, _ in s.knobs]
    proven = [s.field for s in found if all(direction(k, judge.nominal, knobs) for k, _ in s.knobs)]
    return WorstCase(
        **worst,
        classes=classes,
        at=at,
        evaluation=body,
        proven=proven,
        searched=[s.field for s in found if s.field not in proven],
        corners=len(judged[-1][1].eye_ratio),
    )


def _deepen(body: dict[str, Any], field: str) -> None:
    """Make sure that an optional figure is there to be set, in place."""
    *way, last = field.split(".")
    place: Any = body
    for step in way:
        place = place[int(step)] if isinstance(place, list) else place[step]
    place.setdefault(last, 0.0)


def _distribution(name: str, values: Floats) -> Distribution:
    bounded = values[np.isfinite(values)]
    whole = len(bounded) == len(values)
    low = float(np.quantile(values, COVERAGE[0], method="lower"))
    high = float(np.quantile(values, COVERAGE[1], method="higher"))
    histogram = None
    if len(bounded) and np.ptp(bounded) > 0.0:
        counts, edges = np.histogram(bounded, BINS)
        histogram = Histogram(edges=edges.tolist(), counts=counts.tolist())
    return Distribution(
        figure=name,
        mean=float(values.mean()) if whole else None,
        standard_deviation=float(values.std(ddof=1)) if whole else None,
        median=_finite(float(np.quantile(values, 0.5, method="higher"))),
        interval_95=(_finite(low), _finite(high)),
        greatest=_finite(float(values.max())),
        unbounded=float(1.0 - len(bounded) / len(values)),
        histogram=histogram,
    )


def _ranks(values: Floats) -> Floats:
    """Ranks from 0, equal values sharing the mean of theirs."""
    _, inverse, counts = np.unique(_ordered(values), return_inverse=True, return_counts=True)
    return (np.cumsum(counts) - 0.5 * (counts + 1))[inverse]


def _influence(
    judge: _Judge, found: Sequence[Spread], values: Mapping[str, Floats], output: Floats
) -> list[Influence]:
    """Squared rank correlation of every field with the output, and the swing of each alone."""
    ranks = _ranks(output)
    squared = []
    for spread in found:
        own = _ranks(values[spread.field])
        varies = own.std() > 0.0 and ranks.std() > 0.0
        squared.append(float(np.corrcoef(own, ranks)[0, 1] ** 2) if varies else 0.0)
    total = sum(squared) or 1.0
    ends = {s.field: np.full(2 * len(found), s.value) for s in found}
    for k, spread in enumerate(found):
        ends[spread.field][2 * k : 2 * k + 2] = spread.low, spread.high
    alone = judge(_turn(found, ends))
    order = np.argsort([-s for s in squared], kind="stable").tolist()
    return [
        Influence(
            field=found[k].field,
            rank=n + 1,
            share=squared[k] / total,
            low=found[k].low,
            high=found[k].high,
            at_low=Figures(**judge.figures(alone, 2 * k)),
            at_high=Figures(**judge.figures(alone, 2 * k + 1)),
        )
        for n, k in enumerate(order)
    ]


def _notices(found: Sequence[Spread], drawn: Outcomes) -> list[Notice]:
    notices = []
    if any(s.deviation for s in found):
        notices.append(
            Notice(
                code="normal-tolerance",
                field="tolerances",
                text="A tolerance with a normal meaning covers 95 % of the values. The worst case and the "
                "draws go half as far again, to three standard deviations; values beyond are not judged.",
            )
        )
    if np.isinf(drawn.eye_distance_m).any():
        notices.append(
            Notice(
                code="unbounded-draws",
                field=None,
                text="In some draws the beam does not spread and there is no hazard distance.",
            )
        )
    return notices
