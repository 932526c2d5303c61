"""The report's first part: what an officer reads and signs."""

from __future__ import annotations

from service.contract.evaluation import EvaluationResult
from service.contract.protection import AtPlace, PairCheck
from service.contract.result import TargetAnswer
from service.web import present
from service.web.chart import Chart
from service.web.numbers import plain
from service.web.report_besides import besides_blocks
from service.web.report_blocks import (
    Block,
    bullets,
    down,
    heading,
    pairs,
    paragraph,
    printable,
    reached,
    table,
    up,
    verdict,
)

__all__ = ["answer_blocks", "named_targets", "setup_blocks", "verdict_blocks"]

ORDERS = {
    "engineering": "Engineering first",
    "administrative": "Then administrative",
    "personal": "Then personal",
    "other": "Hazards other than the beam",
}


def named_targets(result: EvaluationResult) -> list[tuple[str, TargetAnswer]]:
    """The targets with what the report calls them."""
    found = [("Eye", result.eye), ("Skin", result.skin)]
    return found if result.eye_aided is None else [*found, ("Eye with optical aid", result.eye_aided)]


def verdict_blocks(result: EvaluationResult, chart: Chart) -> list[Block]:
    """What counts, in sentences, and the cautions."""
    blocks = [heading("Result")]
    for (name, target), sentence in zip(named_targets(result), chart.sentences, strict=False):
        state = "unsafe" if target.hazard_zone_m else "within"
        blocks.append(verdict(name, sentence.partition(": ")[2].capitalize(), state))
    if result.scan is not None:
        cases = {
            "If it stops, eye": result.scan.failure_eye,
            "If it stops, skin": result.scan.failure_skin,
            "If it stops, eye with optical aid": result.scan.failure_eye_aided,
        }
        for name, stopped in cases.items():
            if stopped is not None:
                state = "open" if stopped.hazard_zone_m else "within"
                blocks.append(verdict(name, _stopped(stopped), state))
    for n in result.notices:
        if n.code == "skin-longer-exposure":
            blocks.append(verdict("Skin, longer", n.text, "open"))
    return [*blocks, {"kind": "cautions", "items": [printable(text) for text in result.cautions]}]


def _stopped(target: TargetAnswer) -> str:
    """How far a beam that stands still exceeds a limit."""
    if target.hazard_distance_m == 0.0:
        return "Exceeds no limit at any distance."
    far = target.hazard_distance_m
    reach = "at every distance" if far is None else f"out to {up(far, 'm')}"
    return f"Unsafe {reach}, {up(target.hazard_ratio)} times the limit."


def answer_blocks(result: EvaluationResult, chart: Chart, svg: str) -> list[Block]:
    """Durations, figures, notices, class, eyewear, chart, measures."""
    blocks = [*_durations(result), heading("Key figures"), _figures(result), *besides_blocks(result)]
    if result.notices:
        blocks += [
            heading("Please check"),
            bullets([f"{n.code.replace('-', ' ').capitalize()}. {n.text}" for n in result.notices]),
        ]
    blocks += _classes(result) + _protection(result)
    blocks += [
        heading("Exposure against distance"),
        {"kind": "chart", "svg": svg, "alt": printable(chart.plot.description)},
        paragraph(
            "Solid line: eye. Dashed line: skin. "
            + ("Dotted line: eye behind the optical aid. " if result.eye_aided else "")
            + "Bars above: the hazard zones. Level line: the limit.",
            small=True,
        ),
        _chart_table(chart),
    ]
    return blocks + _measures(result)


def _durations(result: EvaluationResult) -> list[Block]:
    several = len(result.durations) > 1
    lines = [f"Line {d.line + 1}: " if several else "" for d in result.durations]
    rows = [
        f"{line}{plain(d.exposure_s)} s, {d.basis} ({present.KNOWN[d.known]})"
        for line, d in zip(lines, result.durations, strict=True)
    ]
    return [
        heading("Exposure duration and rule set"),
        bullets([*rows, f"{result.rules.title}. {result.rules.standing_text}"]),
    ]


def _figures(result: EvaluationResult) -> Block:
    targets = [t for _, t in named_targets(result)]
    rows = [
        ["Hazard distance", *(reached(t.hazard_distance_m) for t in targets)],
        ["Hazard zone", *(_zone(t) for t in targets)],
        [
            "Exposure / limit at the worst place",
            *(f"{up(t.hazard_ratio)} at {down(t.worst_place_m, 'm')}" for t in targets),
        ],
        ["Optical density needed", *(up(t.optical_density) for t in targets)],
        ["Governed by", *(_governed(t, len(result.durations)) for t in targets)],
    ]
    if result.eye.at_distance is not None:
        at = f"At {plain(result.eye.at_distance.distance_m)} m"
        there = [t.at_distance for t in targets if t.at_distance is not None]
        rows.append(
            [
                f"{at}: exposure / limit",
                *(f"{up(a.hazard_ratio)}, {'above' if a.exceeded else 'within'} the limit" for a in there),
            ]
        )
        rows.append([f"{at}: optical density needed", *(up(a.optical_density) for a in there)])
    return table(["", *(n for n, _ in named_targets(result))], rows, [1.3, *(1.0 for _ in targets)])


def _zone(target: TargetAnswer) -> str:
    if target.hazard_zone_m is None:
        return "none"
    near, far = target.hazard_zone_m
    return f"{down(near, 'm')} to {'no end' if far is None else up(far, 'm')}"


def _governed(target: TargetAnswer, lines: int) -> str:
    own, added = present.governing(target), present.governing_sum(target)
    line = f", line {own.line + 1}" if lines > 1 else ""
    text = f"{present.RULE_NAMES[own.rule]}, {own.tissue} ({own.effect}){line}"
    if added is None:
        return text
    return f"lines {' + '.join(str(n + 1) for n in added.lines)} added; largest share: {text}"


def _classes(result: EvaluationResult) -> list[Block]:
    rows = [
        [
            f"Class {c.hazard_class}",
            f"{c.title} ({c.standing})",
            f"{c.reason[:1].upper()}{c.reason[1:]}. {'; '.join(level.margin for level in c.levels)}.",
        ]
        for c in result.classification
    ]
    return [heading("Hazard class"), table(["Class", "After", "Why"], rows, [0.6, 1.3, 3.1])]


def _protection(result: EvaluationResult) -> list[Block]:
    rows = []
    for line in result.protection.lines:
        name = f"{line.line + 1}: {plain(line.wavelength_nm)} nm"
        named = ((name, line.worst_place), (f"{name}, behind the optics", line.behind_aid))
        for text, place in (*named, (name, line.at_distance)):
            if place is not None:
                rows.append(_need(text, place))
    head = [
        "Line",
        "At",
        "Optical density",
        "Highest transmittance",
        "EN 207 scale number by mode",
        "EN 208, aligning",
    ]
    blocks = [
        heading("Eyewear, windows and screens"),
        paragraph(present.eyewear_sentence(result)),
        table(head, rows, [1.0, 0.7, 0.7, 1.0, 1.7, 1.2]),
    ]
    for pair in sorted(result.protection.eyewear, key=lambda p: p.rank):
        blocks += _pair(pair)
    if result.protection.windows:
        blocks.append(_windows(result))
    if result.protection.remarks:
        blocks.append(bullets(result.protection.remarks, small=True))
    return blocks


def _need(line: str, place: AtPlace) -> list[str]:
    numbers = [f"{s.mode} {present.scale('LB', s.scale_number_needed)}" for s in place.scale_numbers]
    text = ", ".join(numbers)
    if place.scale_table_too_weak:
        text += f"; LB alone is too weak, the limits need {present.scale('LB', place.scale_number)}"
    aligning = "not for this line"
    if place.alignment is not None:
        number, left = place.alignment.scale_number, place.alignment.remaining_ratio
        aligning = "beyond RB5" if number is None else f"{present.scale('RB', number)} (from memory)"
        if left is not None and left > 1.000000001:
            aligning += f"; up to {up(left)} times the limit remains"
    return [
        line,
        down(place.distance_m, "m"),
        up(place.optical_density),
        down(place.transmittance),
        text,
        aligning,
    ]


def _pair(pair: PairCheck) -> list[Block]:
    state, words = ("within", "sufficient") if pair.sufficient else ("unsafe", "not sufficient")
    if pair.dense_enough and not pair.sufficient:
        state, words = "open", "dense enough, but nothing shows that it withstands the beam"
    items = []
    for line in pair.lines:
        enough = "enough" if line.enough else "not enough"
        found = [f"{plain(line.wavelength_nm)} nm (line {line.line + 1}): {enough}."]
        found += [f"{text[:1].upper()}{text[1:]}." for text in line.missing]
        if line.optical_density is not None:
            found.append(
                f"Optical density {plain(line.optical_density)}, {up(line.optical_density_needed)} needed."
            )
        for mode in line.modes:
            marked = "not marked" if mode.marked is None else present.scale("LB", mode.marked)
            found.append(f"Mode {mode.mode}: {marked}, {present.scale('LB', mode.needed)} needed.")
        if not pair.alignment_only:
            found.append(f"Behind the filter: {up(line.remaining_ratio)} times the limit.")
        items.append(" ".join(found))
    behind = (
        "Not for protection."
        if pair.alignment_only
        else f"All lines behind the filter: {up(pair.remaining_ratio)} times the limit."
    )
    return [
        verdict(printable(pair.name), words, state),
        bullets([*items, behind, *pair.warnings], small=True),
    ]


def _windows(result: EvaluationResult) -> Block:
    rows = []
    for w in result.protection.windows:
        behind = "not stated"
        if w.remaining_ratio is not None:
            enough = "sufficient" if w.sufficient else "not sufficient"
            behind = f"{up(w.remaining_ratio)} times the limit: {enough}"
        load = up(w.irradiance_w_m2, "W/m²") if w.irradiance_w_m2 else ""
        if w.radiant_exposure_j_m2 is not None:
            load = f"{load} {up(w.radiant_exposure_j_m2, 'J/m²')} a pulse".strip()
        stated = "none" if w.optical_density is None else plain(w.optical_density)
        rows.append(
            [
                f"{w.name}, {plain(w.distance_m)} m",
                up(w.hazard_ratio),
                up(w.optical_density_needed),
                stated,
                behind,
                load,
                f"{present.scale('AB', w.screen_number)}; {w.screen_scope}",
            ]
        )
    head = [
        "Window, distance",
        "Exposure / limit",
        "Density needed",
        "Stated",
        "Behind it",
        "Must withstand",
        "EN 12254",
    ]
    return table(head, rows, [1.1, 0.8, 0.7, 0.6, 1.0, 1.0, 1.8])


def _chart_table(chart: Chart) -> Block:
    head = ["Distance, m"]
    for name in chart.names:
        head += [f"{name}: exposure / limit", f"{name}: exposure, J/m²", f"{name}: limit, J/m²"]
    rows, marked = [], []
    for k, row in enumerate(chart.rows):
        cells = [plain(row.distance_m)]
        for ratio, exposure, limit in row.figures:
            cells += [up(ratio), up(exposure), down(limit)]
        rows.append(cells)
        marked += [k] if row.chosen else []
    return table(head, rows, [1.0] * len(head), marked)


def _measures(result: EvaluationResult) -> list[Block]:
    blocks = [heading("Usual control measures"), paragraph(result.measures.reminder)]
    for order, name in ORDERS.items():
        items = [f"{i.text} ({i.asked_by})" for i in result.measures.items if i.order == order]
        if items:
            blocks += [heading(name, 2), bullets(items, boxes=True)]
    return blocks


def setup_blocks(parts: list[tuple[str, list[tuple[str, str]]]], title: str) -> list[Block]:
    """A setup, part by part."""
    return [heading(title), pairs((part, "; ".join(f"{n}: {v}" for n, v in rows)) for part, rows in parts)]
