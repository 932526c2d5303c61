"""Steps of the working, and table rows as expressions."""

from __future__ import annotations

from dataclasses import dataclass
from decimal import ROUND_CEILING, Context, Decimal

__all__ = ["Step", "limit_expression", "number", "number_up"]


@dataclass(frozen=True, slots=True)
class Step:
    """One step: symbol, expression in words and numbers, value, unit and source.

    `known` is read, memory, computed or entered. `line` and `criterion` count from 0, the criterion
    within its target; None where the step belongs to all.
    """

    symbol: str
    text: str
    value: float | None
    unit: str
    source: str = ""
    known: str = "computed"
    line: int | None = None
    target: str | None = None
    criterion: int | None = None


def number(x: float) -> str:
    """A number for the text of a step: six significant digits."""
    return f"{x:.6g}"


def number_up(x: float, digits: int = 3) -> str:
    """A positive number for a sentence, rounded up: ratios and distances must not look smaller."""
    return f"{Context(prec=digits, rounding=ROUND_CEILING).create_decimal(Decimal(repr(float(x)))):f}"


def limit_expression(coefficient: float, power: float, factors: str, x: str) -> str:
    """A limit, aperture or pulse factor as an expression: coefficient x base^power x factors."""
    parts = [] if coefficient == 1 and (power or factors) else [f"{coefficient:g}"]
    if power:
        parts.append(f"{x}^{power:g}")
    return " x ".join(parts + factors.split())
