"""Requests to what a revision keeps: key figures, digests of the tables, the whole result.

Many requests are evaluated in one pass; the figures are those of the single answer.
"""

from __future__ import annotations

import hashlib
import json
import zlib
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cache
from typing import Any

from pydantic import ValidationError

from service import __version__
from service.bulk.summary import batched, summaries, summary_of
from service.contract.answer import answer, rule_sets
from service.contract.classification import schemes
from service.contract.evaluation import EvaluationResult
from service.contract.problem import invalid_request
from service.contract.request import EvaluationRequest, Viewing
from service.contract.result import TargetAnswer
from service.files import DATA
from service.register.models import EyeFigures, Figures
from service.rules.eyewear import eyewear_tables
from service.rules.tables import digest_of as files_digest

__all__ = [
    "CHUNK",
    "Kept",
    "canonical",
    "class_rank",
    "digest_of",
    "evaluated",
    "figures_of",
    "kept",
    "packed",
    "request_from",
    "tables_digest",
    "tables_of",
    "unpacked",
]

#: Lasers evaluated as one batch.
CHUNK = 1000


@dataclass(frozen=True, slots=True)
class Kept:
    """What a revision keeps of an evaluation; `result` is the whole answer as JSON text, if kept."""

    request: EvaluationRequest
    figures: Figures
    result: str | None


def canonical(data: Any) -> str:
    """JSON text with one order and no blanks: what digests are taken of."""
    return json.dumps(data, sort_keys=True, separators=(",", ":"), ensure_ascii=False, allow_nan=False)


def digest_of(text: str) -> str:
    """sha256: and the hexadecimal digest of a text."""
    return f"sha256:{hashlib.sha256(text.encode()).hexdigest()}"


def request_from(text: str) -> EvaluationRequest:
    """The request that a revision holds. Raises InvalidRequest where this version cannot read it."""
    try:
        return EvaluationRequest.model_validate(json.loads(text))
    except ValidationError as error:
        raise invalid_request(error) from None


def packed(text: str) -> bytes:
    """A result for storage."""
    return zlib.compress(text.encode(), 6)


def unpacked(data: bytes) -> str:
    """A stored result as text."""
    return zlib.decompress(data).decode()


@cache
def tables_of(rules_id: str) -> dict[str, str]:
    """Digest of every table that a result under a rule set rests on."""
    found = {f"rules/{rules_id}": rule_sets()[rules_id].rules.digest}
    found |= {f"classes/{key}": s.scheme.digest for key, s in schemes().items()}
    return found | {
        "eyewear": eyewear_tables(DATA).digest,
        "materials": files_digest([DATA / "materials.csv"]),
    }


@cache
def tables_digest(rules_id: str) -> str:
    """One digest over those tables and the version of the service that computes with them."""
    return digest_of(canonical({**tables_of(rules_id), "service": __version__}))


def class_rank(name: str) -> int:
    """Place of a class in the default scheme, the least hazardous first."""
    return [c.name for c in next(iter(schemes().values())).scheme.classes].index(name)


def kept(request: EvaluationRequest) -> Kept:
    """Evaluate one request, the whole result kept. Raises InvalidRequest for an unknown rule set."""
    result = answer(request)
    return Kept(request, _figures_of_answer(request, result), result.model_dump_json())


def evaluated(requests: Sequence[EvaluationRequest]) -> list[Kept]:
    """Evaluate many requests; key figures only. Raises InvalidRequest for an unknown rule set."""
    found: dict[int, Figures] = {}
    for indexes, part in figures_of(requests):
        found.update(zip(indexes, part, strict=True))
    return [Kept(r, found[k], None) for k, r in enumerate(requests)]


def figures_of(requests: Sequence[EvaluationRequest]) -> Iterator[tuple[list[int], list[Figures]]]:
    """Key figures of many requests, batch by batch, each with the places of its requests.

    A viewing distance changes none of them, so requests that say no more of viewing share a batch.
    """
    together: list[int] = []
    for k, request in enumerate(requests):
        if batched(_nowhere(request)):
            together.append(k)
        else:
            yield [k], [_figures_of_answer(request, answer(request))]
    for start in range(0, len(together), CHUNK):
        chunk = together[start : start + CHUNK]
        found = summaries([_nowhere(requests[k]) for k in chunk], chunk)
        yield chunk, [_figures(requests[k], s) for k, s in zip(chunk, found, strict=True)]


def _nowhere(request: EvaluationRequest) -> EvaluationRequest:
    """The request without its viewing distance, where nothing else is said of viewing."""
    if request.viewing.model_fields_set == {"distance_m"}:
        return request.model_copy(update={"viewing": Viewing()})
    return request


def _figures_of_answer(request: EvaluationRequest, result: EvaluationResult) -> Figures:
    found = _figures(request, summary_of(result, request.label, 0))
    more: dict[str, Any] = {}
    if result.eye_aided is not None:
        more["aided"] = _eye(result.eye_aided)
    if result.scan is not None:
        more["stopped"] = _eye(result.scan.failure_eye)
        if result.scan.failure_eye_aided is not None:
            more["stopped_aided"] = _eye(result.scan.failure_eye_aided)
        more["stopped_skin_hazard_distance_m"] = result.scan.failure_skin.hazard_distance_m
    return found.model_copy(update=more)


def _eye(target: TargetAnswer) -> EyeFigures:
    return EyeFigures(
        hazard_distance_m=target.hazard_distance_m,
        hazard_ratio=target.hazard_ratio,
        optical_density=target.optical_density,
    )


def _figures(request: EvaluationRequest, summary: dict[str, Any]) -> Figures:
    eye, skin = summary["eye"], summary["skin"]
    return Figures(
        rules=request.rules,
        wavelengths_nm=[line.wavelength_nm for line in request.lines],
        hazard_classes=summary["classes"],
        eye_hazard_distance_m=eye["hazard_distance_m"],
        skin_hazard_distance_m=skin["hazard_distance_m"],
        eye_hazard_ratio=eye["hazard_ratio"],
        skin_hazard_ratio=skin["hazard_ratio"],
        optical_density=eye["optical_density"],
        eye_governing=_governing(eye["governing"]),
        skin_governing=_governing(skin["governing"]),
    )


def _governing(criterion: dict[str, Any]) -> str:
    return f"{criterion['rule']}, {criterion['tissue']} {criterion['effect']}"
