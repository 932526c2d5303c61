"""The cases themselves: how many are pinned, that each has a source, and that none is idle."""

from __future__ import annotations

import importlib
from pathlib import Path

import pytest

from service.contract.checks import half_a_unit
from tests.published.cases import CASES, PINNED, UNITS

HERE = Path(__file__).parent

# Reading the modules fills PINNED, whichever of them this run selects.
for path in sorted(HERE.glob("test_*.py")):
    if path != Path(__file__):
        importlib.import_module(f"{__package__}.{path.stem}")


def test_at_least_sixty_cases_are_pinned_each_with_its_source() -> None:
    assert len(PINNED) == len(set(PINNED)), "an id is pinned twice"
    assert len(PINNED) >= 60
    for case in (CASES[name] for name in PINNED):
        assert case.source.strip(), case.id
        assert case.how_known.strip(), case.id
        assert case.trust in ("A", "B"), f"{case.id}: trust {case.trust} is no check"


def test_no_case_is_idle() -> None:
    """Every case in the file is pinned, or its newer edition is."""
    newer = {name for name, case in CASES.items() if case.newer}
    assert set(CASES) == set(PINNED) | newer


def test_every_case_is_complete() -> None:
    for case in CASES.values():
        assert case.unit in UNITS, case.id
        assert case.printed_value > 0, case.id
        assert case.printed_precision >= 1, case.id
        assert case.quantity, case.id
        assert case.formula, case.id


@pytest.mark.parametrize(
    ("printed", "digits", "half"),
    [(86, 2, 0.5), (2.6e-9, 2, 0.05e-9), (1e-7, 2, 0.05e-7), (1000.0, 1, 500.0), (0.042, 2, 5e-4)],
)
def test_half_a_unit(printed: float, digits: int, half: float) -> None:
    assert half_a_unit(printed, digits) == pytest.approx(half, rel=1e-15)
