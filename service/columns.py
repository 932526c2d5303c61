"""Columns in, columns out: the function for notebooks, sweeps and partitions of large tables.

>>> import numpy as np
>>> from service.columns import evaluate_columns
>>> power = np.geomspace(1e-3, 1.0, 4)
>>> found = evaluate_columns({"wavelength_nm": 532, "mode": "cw", "power_w": power,
...                           "diameter_mm": 2.0, "divergence_mrad": 1.0})
>>> found["class_iec_60825_1_2014"].tolist()
['2', '3B', '3B', '4']
>>> len(found["eye_hazard_distance_m"])
4
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from service.assess.evaluate import evaluate
from service.bulk.arrays import quick_lines, ranges
from service.bulk.findings import find
from service.bulk.flat import (
    COLUMNS,
    NUMBERS,
    WORST,
    absent,
    check_columns,
    class_column,
    flat_record,
    nested,
    problem_text,
    result_columns,
)
from service.bulk.summary import summaries
from service.contract.answer import rule_set
from service.contract.convert import conventional_durations
from service.contract.problem import Problem
from service.contract.reading import request_of
from service.rules.ruleset import DEFAULT_RULES, TARGETS

__all__ = ["COLUMNS", "evaluate_columns"]

Column = NDArray[Any]
#: Rows evaluated in one pass; larger passes are no faster.
CHUNK = 16_384
#: Rows of one pass where notices are wanted.
NOTICE_CHUNK = 1000
FLOATS = (
    "hazard_distance_m",
    "hazard_from_m",
    "hazard_ratio",
    "optical_density",
    "ratio_at_distance",
    "density_at_distance",
)


def evaluate_columns(columns: Mapping[str, Any], *, notices: bool = False) -> dict[str, Column]:
    """Evaluate a table of lasers, one laser of one line per row.

    Parameters
    ----------
    columns : a dict of arrays, lists or single values, or a data frame. The names are those of the API's
        fields with their units (see `COLUMNS`): wavelength_nm [nm], power_w [W], energy_j [J],
        average_power_w [W], pulse_s [s], rate_hz [Hz], diameter_mm [mm], divergence_mrad [mrad] (full
        angle), diameter_y_mm and divergence_y_mrad for elliptical beams, waist_m [m], subtense_mrad [mrad],
        exposure_s [s], distance_m [m] (viewing distance), those of fibre ends; text in label, rules, mode,
        profile, level, diameter_at. A single value holds for every row. NaN, None and empty text are fields
        that are not given; the API's defaults then hold.
    notices : also list the codes of the API's notices in the column `notices` (slower: every row is read as
        a request; otherwise the column is empty)

    Returns
    -------
    dict of arrays, one element per row. For `eye` and `skin`: `eye_hazard_distance_m` and
    `eye_hazard_from_m` [m] (ends of the hazard zone; 0 where nothing is exceeded, infinite where a beam
    never falls below its limit), `eye_hazard_ratio`, `eye_optical_density`, and the governing criterion in
    `eye_line`, `eye_rule`, `eye_tissue`, `eye_effect`, `eye_row`; where a viewing distance is given
    `eye_ratio_at_distance` and `eye_density_at_distance`, else NaN. `worst_eye_hazard_distance_m`,
    `worst_skin_hazard_distance_m` and `worst_optical_density` are these here; in files of whole requests they
    count optical aids and sweeps that stop. The hazard class by scheme in
    `class_iec_60825_1_2014` and `class_us_21cfr1040`; `rules` and `rules_digest` tell which tables made the
    row. A row that cannot be used has its reason in `problem` and NaN in every number.

    Every figure equals that of POST /api/v1/evaluate bit for bit.

    Raises
    ------
    UnknownColumn for a column that no field has; ValueError where columns differ in length.
    """
    table, count = _table(columns)
    found = _blank(count)
    found["label"][:] = table.get("label", "")
    size = NOTICE_CHUNK if notices else CHUNK
    for start in range(0, count, size):
        part = {name: column[start : start + size] for name, column in table.items()}
        view = {name: column[start : start + size] for name, column in found.items()}
        quick = np.zeros(len(view["problem"]), dtype=bool)
        if not notices:
            quick = _evaluate_quick(part, view)
        _evaluate_requests(part, np.flatnonzero(~quick), view, notices)
    return found


def _table(columns: Mapping[str, Any]) -> tuple[dict[str, Column], int]:
    """The columns as arrays of one length: numbers as floats where they are, text as objects."""
    names = [str(name) for name in columns.keys()]  # noqa: SIM118  a data frame iterates over its names too
    check_columns(names)
    arrays = {name: _array(columns[name]) for name in names}
    lengths = {name: len(a) for name, a in arrays.items() if a.ndim == 1}
    if any(a.ndim > 1 for a in arrays.values()) or len(set(lengths.values())) > 1:
        raise ValueError(f"the columns must be one-dimensional and of one length; they are {lengths}")
    count = next(iter(lengths.values()), 1 if arrays else 0)
    table = {}
    for name, array in arrays.items():
        numeric = name in NUMBERS and array.dtype.kind in "fiu"
        table[name] = np.broadcast_to(array.astype(np.float64 if numeric else object), (count,))
    return table, count


def _array(column: Any) -> Column:
    """A column as an array; a list may mix numbers, text and None, which numpy would all turn into text."""
    typed = hasattr(column, "__array__")
    return np.asarray(column) if typed else np.array(column, dtype=object)


def _blank(count: int) -> dict[str, Column]:
    """Result columns before anything is known."""
    found: dict[str, Column] = {}
    for name in result_columns():
        target, _, rest = name.partition("_")
        if name in WORST or (target in TARGETS and rest in FLOATS):
            found[name] = np.full(count, np.nan)
        elif target in TARGETS and rest == "line":
            found[name] = np.full(count, -1, dtype=np.intp)
        else:
            found[name] = np.full(count, "", dtype=object)
    return found


def _evaluate_quick(part: dict[str, Column], view: dict[str, Column]) -> NDArray[np.bool_]:
    """Evaluate in one pass per rule set what the arrays alone show to be valid; which rows that were."""
    quick, lines = quick_lines(part, ranges())
    named = part.get("rules")
    ids = np.full(len(quick), DEFAULT_RULES, dtype=object) if named is None else named
    ids = np.array([DEFAULT_RULES if absent(i) else str(i) for i in ids], dtype=object)
    for rules_id in dict.fromkeys(ids[quick].tolist()):
        chosen = np.flatnonzero(quick & (ids == rules_id))
        try:
            rules = rule_set(rules_id)
        except Problem as problem:
            view["problem"][chosen] = problem_text(problem.document().model_dump())
            continue
        batch = lines.take(chosen, lines.exposure_s[chosen])
        conventional_durations(batch.wavelength_nm, batch.exposure_s, rules)
        with np.errstate(over="ignore", under="ignore"):
            findings = find(batch, evaluate(batch, rules))
        view["rules"][chosen], view["rules_digest"][chosen] = rules_id, rules.rules.digest
        for target in TARGETS:
            figures = findings.targets[target]
            names = dict(
                zip(("rule", "tissue", "effect", "row"), findings.governing_names(target), strict=True)
            )
            values = {
                "hazard_distance_m": figures.far_m,
                "hazard_from_m": np.where(figures.far_m > 0.0, figures.near_m, 0.0),
                "hazard_ratio": figures.ratio,
                "optical_density": figures.density,
                "line": figures.line,
                **names,
            }
            for name, value in values.items():
                view[f"{target}_{name}"][chosen] = value
        # Nothing sweeps and nobody looks through optics here.
        eye, skin = (findings.targets[target] for target in ("eye", "skin"))
        for name, value in zip(WORST, (eye.far_m, skin.far_m, eye.density), strict=True):
            view[name][chosen] = value
        for scheme in findings.classes:
            view[class_column(scheme)][chosen] = findings.class_names(scheme)
    return quick


def _evaluate_requests(part: dict[str, Column], which: Column, view: dict[str, Column], codes: bool) -> None:
    """Evaluate rows as requests: those that are not plain, and all whose notices are wanted."""
    requests, good = [], []
    for k in which.tolist():
        row = {name: _cell(column[k]) for name, column in part.items() if not absent(column[k])}
        try:
            request = request_of(nested(row))
            rule_set(request.rules)
        except Problem as problem:
            view["problem"][k] = problem_text(problem.document().model_dump())
        else:
            requests.append(request)
            good.append(k)
    for k, record in zip(good, summaries(requests, range(len(requests))), strict=True):
        flat = flat_record(record)
        if not codes:
            flat["notices"] = ""
        for name, value in flat.items():
            view[name][k] = value


def _cell(value: Any) -> Any:
    """A cell as JSON has it: plain text, or a plain number."""
    return value.item() if isinstance(value, np.generic) else value
