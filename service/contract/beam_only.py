"""What of an evaluation the calls beside it judge, refuse, or leave to the evaluation itself."""

from __future__ import annotations

from service.contract.bench import Diffuser, Scanner
from service.contract.bounds_medium import refuse
from service.contract.notices import input_notices
from service.contract.request import EvaluationRequest
from service.contract.result import Notice

__all__ = ["evaluation_notices", "refuse_aid", "refuse_bench", "refuse_end"]

#: Parts of an evaluation that change none of the figures of these calls, and what they are called.
LEFT = {
    "distance_m": "the viewing distance",
    "over_distance": "results over distance",
    "outdoors": "interference with aircraft",
    "eyewear": "eyewear",
    "windows": "windows",
}


def refuse_aid(evaluation: EvaluationRequest) -> None:
    """Raises InvalidRequest where optics stand in front of the eye."""
    if evaluation.viewing.aid is not None:
        raise refuse(
            "evaluation.viewing.aid",
            None,
            "the eye without optics",
            "binoculars, telescopes and loupes are not judged here",
            "Leave the optics out here; the evaluation itself judges the eye with them.",
        )


def refuse_end(evaluation: EvaluationRequest) -> None:
    """Raises InvalidRequest where the beam ends on a diffuser or scanner."""
    last = evaluation.bench[-1] if evaluation.bench else None
    if isinstance(last, Diffuser | Scanner):
        raise refuse(
            f"evaluation.bench.{len(evaluation.bench) - 1}.element",
            last.element,
            "a beam that passes every element",
            f"behind a {last.element} the limits change with the distance, which is not judged here",
            "Evaluate it with the highest power or energy there may be: more is never safer.",
        )


def refuse_bench(evaluation: EvaluationRequest) -> None:
    """Raises InvalidRequest where there is a bench."""
    if evaluation.bench:
        raise refuse(
            "evaluation.bench",
            f"a list of {len(evaluation.bench)} items",
            "an evaluation without a bench",
            "what a bench makes of the picture of a source is not known here",
            "Leave the bench out, and enter emission and beam as they leave its last element.",
        )


def evaluation_notices(evaluation: EvaluationRequest, exposure_s: list[float]) -> list[Notice]:
    """Notices of the evaluation that need no result, and one that names what is not judged here.

    `exposure_s`: exposure duration of each line [s].
    """
    found = [
        n.model_copy(update={"field": f"evaluation.{n.field}"}) for n in input_notices(evaluation, exposure_s)
    ]
    named = {**evaluation.viewing.model_dump(exclude_none=True), **dict(evaluation)}
    left = [words for name, words in LEFT.items() if named.get(name)]
    if left:
        found.append(
            Notice(
                code="left-to-the-evaluation",
                field="evaluation",
                text=f"Not judged here, but in the evaluation itself: {', '.join(left)}.",
            )
        )
    return found
