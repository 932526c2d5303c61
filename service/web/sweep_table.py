"""A sweep as rows: the CSV, the table of a page, the values at which the class changes."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from service.contract.sweep import SweepAnswer, SweptTarget
from service.web.csv_text import csv_text

__all__ = ["class_steps", "listed", "sweep_csv"]

#: Rows of the table of a page.
ROWS = 21
UNBOUNDED = "unbounded"
COLUMNS = (
    "hazard_ratio",
    "optical_density",
    "hazard_near_m",
    "hazard_distance_m",
    "limit_j_m2",
    "limit_w_m2",
    "rule",
    "tissue",
    "row",
    "known",
    "line",
)


def sweep_csv(answer: SweepAnswer) -> str:
    """Every value with every figure; distances without end as `unbounded`."""
    targets = answer.targets()
    head = [answer.sweep.field, *(["exposure_s"] if answer.sweep.field != "exposure_s" else [])]
    head += [f"{name}_{column}" for name, _, _ in targets for column in COLUMNS]
    head += [f"class_{scheme}" for scheme in answer.hazard_class]
    head += ["rules", "rules_digest", "service_version"]

    def rows() -> Iterator[list[str | float | None]]:
        for k, value in enumerate(answer.values):
            row: list[str | float | None] = [value]
            if answer.sweep.field != "exposure_s":
                row.append(answer.exposure_s[k])
            for *_, target in targets:
                row += _figures(target, k)
            row += [names[k] for names in answer.hazard_class.values()]
            yield [*row, answer.rules.id, answer.rules.digest, answer.service_version]

    return csv_text(head, rows())


def _figures(target: SweptTarget, k: int) -> list[str | float | None]:
    figures: list[str | float | None] = []
    for column in COLUMNS:
        value = getattr(target, column)[k]
        figures.append(UNBOUNDED if column == "hazard_distance_m" and value is None else value)
    return figures


def listed(answer: SweepAnswer) -> list[int]:
    """Numbers of the values that a page lists: evenly spread, the ends among them."""
    count = len(answer.values)
    places = np.linspace(0, count - 1, min(ROWS, count))
    return [int(k) for k in np.unique(places.round())]


def class_steps(names: list[str]) -> list[tuple[str, int, int]]:
    """Runs of one class: its name, the first and the last number of the values in it."""
    runs: list[tuple[str, int, int]] = []
    for k, name in enumerate(names):
        if runs and runs[-1][0] == name:
            runs[-1] = (name, runs[-1][1], k)
        else:
            runs.append((name, k, k))
    return runs
