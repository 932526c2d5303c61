"""The criteria by which a beam is judged: every line, rule and limit row that applies.

Rules: `exposure` (CW, limit at the exposure duration T), `single` (limit at the pulse duration),
`average` (limit at T, shared by the N pulses in T), `train` (limit at the pulse duration times
C_P). Pulses closer than the grouping time count as one pulse of that length. N is not rounded.
Limits of pulsed lines are per pulse.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from service.assess.lines import CW, TRAIN, Lines
from service.rules.compiled import CompiledRules
from service.rules.limits import Conditions, LimitTable

__all__ = ["AVERAGE", "EXPOSURE", "RULES", "SINGLE", "TRAIN_RULE", "Criteria", "Exposures", "exposures"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

RULES = ("exposure", "single", "average", "train")
EXPOSURE, SINGLE, AVERAGE, TRAIN_RULE = range(4)


@dataclass(slots=True)
class Exposures:
    """One element per line and rule, in the order of the lines.

    `time_s`: duration [s] at which the limit is taken; `aperture_s`: duration for the aperture;
    `share`: factor from the table's limit to the limit for one pulse (or the whole exposure);
    `count`: pulses N of the rule; `grouped_s`: grouping time [s] where pulses were grouped, else 0;
    `c_p`: repetitive-pulse factor; `c_p_row`: its row number, -1 where none; `dose`: energy [J] per
    pulse, or over the whole exposure.
    """

    line: Ints
    rule: Ints
    time_s: Floats
    aperture_s: Floats
    share: Floats
    count: Floats
    grouped_s: Floats
    c_p: Floats
    c_p_row: Ints
    dose: Floats


def exposures(lines: Lines, at: Conditions, rules: LimitTable) -> Exposures:
    """Every rule that applies to every line. See the module for the rules."""
    trains = lines.mode == TRAIN
    each = np.where(trains, 3, 1)
    line = np.repeat(np.arange(lines.count), each)
    rule = np.where(lines.mode == CW, EXPOSURE, SINGLE)[line]
    dose = np.where(lines.mode == CW, lines.emitted * lines.exposure_s, lines.emitted)[line]
    time = np.where(lines.mode == CW, lines.exposure_s, lines.pulse_s)[line]
    ones = np.ones(line.shape)
    found = Exposures(
        line=line,
        rule=rule,
        time_s=time,
        aperture_s=time,
        share=ones,
        count=ones,
        grouped_s=np.zeros(line.shape),
        c_p=ones,
        c_p_row=np.full(line.shape, -1, dtype=np.intp),
        dose=dose,
    )
    which = trains.nonzero()[0]
    if which.size:
        _add_trains(found, lines, at, rules, which, (np.cumsum(each) - each)[which])
    return found


def _add_trains(
    found: Exposures, lines: Lines, at: Conditions, rules: LimitTable, which: Ints, first: Ints
) -> None:
    """Fill in the `average` and `train` exposures, which follow each train's `single` one."""
    pulse, rate, exposure = lines.pulse_s[which], lines.rate_hz[which], lines.exposure_s[which]
    average, train = first + 1, first + 2
    found.time_s = found.time_s.copy()
    found.aperture_s = found.time_s.copy()
    found.share, found.count, found.c_p = (a.copy() for a in (found.share, found.count, found.c_p))

    found.rule[average] = AVERAGE
    found.time_s[average] = found.aperture_s[average] = exposure
    found.count[average] = np.maximum(1.0, rate * exposure)
    found.share[average] = 1.0 / found.count[average]

    repetition = rules.repetition
    grouping = repetition.grouping_s(lines.wavelength_nm[which])
    grouped = rate * grouping > 1.0
    length = np.where(grouped, grouping, pulse)
    within = np.minimum(exposure, at.long_break_s[which]) if repetition.within_long_break else exposure
    with np.errstate(divide="ignore"):
        count = np.maximum(1.0, np.where(grouped, within / grouping, rate * within))
    row = repetition.row(length, grouping, exposure, at.subtense_mrad[which], count)
    c_p = repetition(row, count)
    found.rule[train] = TRAIN_RULE
    found.time_s[train] = length
    found.count[train] = count
    found.grouped_s[train] = np.where(grouped, grouping, 0.0)
    found.c_p[train], found.c_p_row[train] = c_p, row
    found.share[train] = c_p / np.where(grouped, rate * grouping, 1.0)


@dataclass(slots=True)
class Criteria:
    """The criteria of one target: 1-d arrays in the order of lines, rules and rows.

    `exposure` indexes the exposures, `row` the limit rows, `line` the lines. `limit_j_m2` is the
    limit per pulse or over the whole exposure, `aperture_m` the limiting aperture, `strength` the
    ratio of exposure to limit if the whole beam passed the aperture.
    """

    exposure: Ints
    line: Ints
    row: NDArray[np.int16]
    limit_j_m2: Floats
    aperture_m: Floats
    strength: Floats

    @classmethod
    def of(cls, target: str, found: Exposures, cell: Ints, at: Conditions, rules: CompiledRules) -> Criteria:
        """All rows of `target` that hold for the exposures in their grid cells."""
        rows = rules.grid.rows(target, cell, (found.rule == TRAIN_RULE).astype(np.intp))
        e, slot = np.nonzero(rows >= 0)
        row = rows[e, slot]
        line = found.line[e]
        limit = rules.values(row, at, line, found.time_s[e]) * found.share[e]
        aperture = rules.apertures(row, at.wavelength_nm[line], found.aperture_s[e])
        strength = found.dose[e] / (np.pi / 4.0 * aperture * aperture * limit)
        return cls(e, line, row, limit, aperture, strength)
