"""The report's second part: what lets somebody check it by hand."""

from __future__ import annotations

from collections.abc import Sequence

from service.contract.answer import rule_sets
from service.contract.evaluation import EvaluationResult
from service.contract.result import TargetAnswer, WorkingStep
from service.web import present
from service.web.formula import formula
from service.web.report_answer import named_targets
from service.web.report_blocks import Block, Cell, bullets, down, heading, pairs, paragraph, table, up
from service.web.runs import Run, runs

__all__ = ["working_blocks"]


def working_blocks(result: EvaluationResult, body: str) -> list[Block]:
    """Criteria, working, working of class and density, sources, provenance, the request as JSON."""
    blocks = [heading("Criteria")]
    for name, target in named_targets(result):
        blocks += [heading(name, 2), _criteria(target)]
    blocks += [heading("Working"), _steps(result.working, len(result.durations))]
    for c in result.classification:
        blocks += [heading(f"Working of the class, {c.title}", 2), _steps(c.working, len(result.durations))]
        blocks.append(bullets([*c.remarks, c.standing_text], small=True))
    for line in result.protection.lines:
        name = f"Working of density and scale numbers, line {line.line + 1}"
        blocks += [heading(name, 2), _steps(line.worst_place.working, len(result.durations))]
    return (
        blocks
        + _sources(result)
        + _provenance(result)
        + [heading("The request", 2), {"kind": "code", "text": body}]
    )


def _criteria(target: TargetAnswer) -> Block:
    added = present.governing_sum(target)
    rows: list[list[Cell]] = []
    marked = []
    for k, c in enumerate(target.criteria):
        if k == target.governing:
            marked += [] if added else [k]
        tag = "" if k != target.governing else " (largest share)" if added else " (governs)"
        rows.append(
            [
                str(c.line + 1),
                f"{present.RULE_NAMES[c.rule]}{tag}",
                f"{c.tissue}, {c.effect}{f'. {c.note}' if c.note else ''}",
                down(c.limit_j_m2),
                down(c.limit_w_m2),
                down(c.aperture_mm),
                up(c.hazard_ratio),
                "unbounded" if c.hazard_distance_m is None else up(c.hazard_distance_m),
                present.KNOWN[c.known],
            ]
        )
    for s in target.sums:
        if s == added:
            marked.append(len(rows))
        lines = " + ".join(str(n + 1) for n in s.lines)
        distance = "unbounded" if s.hazard_distance_m is None else up(s.hazard_distance_m)
        tag = " (counts)" if s == added else ""
        rows.append(
            [
                lines,
                f"lines added{tag}",
                ", ".join(s.tissues),
                "",
                "",
                "",
                up(s.hazard_ratio),
                distance,
                "computed",
            ]
        )
    head = [
        "Line",
        "Rule",
        "Tissue, effect",
        "Limit, J/m²",
        "Limit, W/m²",
        "Aperture, mm",
        "Exposure / limit",
        "Distance, m",
        "Known",
    ]
    return table(head, rows, [0.5, 1.2, 1.6, 1.0, 1.0, 0.8, 1.0, 0.9, 0.9], marked)


def _steps(steps: Sequence[WorkingStep], lines: int) -> Block:
    rows: list[list[Cell]] = []
    for k, step in enumerate(steps):
        owner = (
            [f"{step.target} {step.criterion + 1}" if step.criterion is not None else step.target]
            if step.target
            else []
        )
        owner += [f"line {step.line + 1}"] if step.line is not None and lines > 1 else []
        value: list[Run] = []
        if step.value is not None:
            value = runs(present.working_value(step))
            value += [Run(" ", ""), *runs(formula(step.unit))] if step.unit != "1" else []
        source = f"{step.source}; {present.KNOWN[step.known]}" if step.source else present.KNOWN[step.known]
        rows.append(
            [
                str(k + 1),
                ", ".join(owner),
                runs(formula(step.symbol)),
                runs(formula(step.text)),
                value,
                source,
            ]
        )
    return table(
        ["Step", "For", "Symbol", "Expression", "Value", "Source"], rows, [0.4, 0.65, 0.8, 2.7, 1.15, 2.5]
    )


def _sources(result: EvaluationResult) -> list[Block]:
    """Every document and place that the answer names, how it is known, and the documents in full."""
    steps = [*result.working]
    for scheme in result.classification:
        steps += scheme.working
    for line in result.protection.lines:
        steps += line.worst_place.working
    named = [(c.source, c.known) for _, t in named_targets(result) for c in t.criteria]
    named += [(d.source, d.known) for d in result.durations] + [(s.source, s.known) for s in steps]
    found: dict[str, dict[str, None]] = {}
    for source, known in named:
        if source:
            found.setdefault(source, {})[present.KNOWN[known]] = None
    documents = rule_sets()[result.rules.id].rules.sources.values()
    titles = [d for d in documents if any(d.short in text for text in found)]
    return [
        heading("Sources"),
        paragraph(
            "What is marked from memory was not re-read in print: hold it against the printed document "
            "before signing."
        ),
        bullets([f"{text} ({', '.join(known)})" for text, known in sorted(found.items())], small=True),
        heading("Documents", 2),
        bullets([f"{d.short}: {d.title}, {d.edition}, {d.year}. {d.publisher}." for d in titles], small=True),
    ]


def _provenance(result: EvaluationResult) -> list[Block]:
    found = result.provenance
    rows: list[tuple[str, Cell]] = [
        ("Service", f"Blinkline {found.service_version}"),
        ("Rule set", f"{result.rules.title} ({result.rules.id})"),
        ("Rule tables", found.rules_digest),
        *((f"Class tables, {c.scheme}", c.digest) for c in result.classification),
        ("Eyewear tables", found.eyewear_digest),
        ("Request", found.request_digest),
    ]
    return [heading("What made this report"), pairs(rows)]
