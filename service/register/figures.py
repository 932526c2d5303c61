"""Requests to what a revision keeps: key figures, digests of the tables, the whole result.

Many requests are evaluated as one structure of arrays; the figures are those of the single answer.
"""

from __future__ import annotations

import hashlib
import json
import zlib
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from pydantic import ValidationError

from service import __version__
from service.assess.classification import classify
from service.assess.criteria import RULES
from service.assess.evaluate import Evaluation, TargetResult, evaluate, optical_density
from service.contract.answer import answer, rule_set, rule_sets
from service.contract.classification import schemes
from service.contract.convert import lines_of
from service.contract.evaluation import EvaluationResult
from service.contract.problem import invalid_request
from service.contract.request import EvaluationRequest
from service.files import DATA
from service.register.models import AidedFigures, Figures
from service.rules.compiled import CompiledRules
from service.rules.eyewear import eyewear_tables

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
    return found | {"eyewear": eyewear_tables(DATA).digest}


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
    return Kept(request, _figures(request, result), result.model_dump_json())


def evaluated(requests: Sequence[EvaluationRequest]) -> list[Kept]:
    """Evaluate many requests; key figures only. Raises InvalidRequest for an unknown rule set."""
    found: dict[int, Figures] = {}
    for indexes, part in figures_of(requests):
        found.update(zip(indexes, part, strict=True))
    return [Kept(r, found[k], None) for k, r in enumerate(requests)]


def figures_of(requests: Sequence[EvaluationRequest]) -> Iterator[tuple[list[int], list[Figures]]]:
    """Key figures of many requests, batch by batch, each with the places of its requests.

    Requests under one rule set share a batch. What the beam meets has no batch path: such requests
    are answered singly.
    """
    groups: dict[str, list[int]] = {}
    for k, request in enumerate(requests):
        if request.bench or request.viewing.model_fields_set - {"distance_m"}:
            yield [k], [_figures(request, answer(request))]
        else:
            groups.setdefault(request.rules, []).append(k)
    for rules_id, members in groups.items():
        rules = rule_set(rules_id)
        for start in range(0, len(members), CHUNK):
            chunk = members[start : start + CHUNK]
            yield chunk, _batch([requests[k] for k in chunk], rules)


def _batch(requests: Sequence[EvaluationRequest], rules: CompiledRules) -> list[Figures]:
    lines, _ = lines_of(requests, rules)
    with np.errstate(over="ignore", under="ignore"):
        evaluation = evaluate(lines, rules)
        classes = {
            key: [scheme.scheme.classes[n].name for n in classify(lines, scheme).number]
            for key, scheme in schemes().items()
        }
        density = optical_density(evaluation.eye.worst_ratio)
    return [
        Figures(
            rules=request.rules,
            wavelengths_nm=[line.wavelength_nm for line in request.lines],
            hazard_classes={key: names[k] for key, names in classes.items()},
            eye_hazard_distance_m=_finite(evaluation.eye.far_m[k]),
            skin_hazard_distance_m=_finite(evaluation.skin.far_m[k]),
            eye_hazard_ratio=float(evaluation.eye.worst_ratio[k]),
            skin_hazard_ratio=float(evaluation.skin.worst_ratio[k]),
            optical_density=float(density[k]),
            eye_governing=_governing(evaluation, evaluation.eye, k),
            skin_governing=_governing(evaluation, evaluation.skin, k),
        )
        for k, request in enumerate(requests)
    ]


def _governing(evaluation: Evaluation, target: TargetResult, laser: int) -> str:
    k = int(target.governing[laser])
    row = evaluation.rules.rules.limits[target.criteria.row[k]]
    rule = RULES[int(evaluation.exposures.rule[int(target.criteria.exposure[k])])]
    return f"{rule}, {row.tissue} {row.effect}"


def _figures(request: EvaluationRequest, result: EvaluationResult) -> Figures:
    eye, skin = (t.criteria[t.governing] for t in (result.eye, result.skin))
    return Figures(
        rules=request.rules,
        wavelengths_nm=[line.wavelength_nm for line in request.lines],
        hazard_classes={c.scheme: c.hazard_class for c in result.classification},
        eye_hazard_distance_m=result.eye.hazard_distance_m,
        skin_hazard_distance_m=result.skin.hazard_distance_m,
        eye_hazard_ratio=result.eye.hazard_ratio,
        skin_hazard_ratio=result.skin.hazard_ratio,
        optical_density=result.eye.optical_density,
        eye_governing=f"{eye.rule}, {eye.tissue} {eye.effect}",
        skin_governing=f"{skin.rule}, {skin.tissue} {skin.effect}",
        aided=None
        if result.eye_aided is None
        else AidedFigures(
            hazard_distance_m=result.eye_aided.hazard_distance_m,
            hazard_ratio=result.eye_aided.hazard_ratio,
            optical_density=result.eye_aided.optical_density,
        ),
    )


def _finite(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None
