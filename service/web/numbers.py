"""Numbers as people type them, and numbers as pages show them.

Typed: a decimal point or a lone decimal comma; an ambiguous grouping is refused with both readings.
Shown: rounded to the safe side, limits down, distances, ratios and densities up.
"""

from __future__ import annotations

import math
import re
from decimal import ROUND_CEILING, ROUND_FLOOR, Context, Decimal

__all__ = ["NotANumber", "parse_number", "plain", "shown_down", "shown_up", "typeset"]

NUMBER = re.compile(r"[+-]?(\d+[.,]?\d*|[.,]\d+)(e[+-]?\d+)?", re.IGNORECASE)
AMBIGUOUS = re.compile(r"[+-]?[1-9]\d{0,2},\d{3}")
GROUPED = re.compile(r"[+-]?\d{1,3}([,. '\u00a0\u2009\u202f]\d{3})+([.,]\d+)?")
SUPERSCRIPT = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
MAX_TEXT = 40


class NotANumber(ValueError):
    """Typed text that is no number, or more than one: `remedy` says what to do."""

    def __init__(self, message: str, remedy: str) -> None:
        super().__init__(message)
        self.remedy = remedy


def parse_number(text: str) -> float:
    """The number that was typed. Raises NotANumber, with both readings where two are possible."""
    typed = text.strip().replace("\u2212", "-")
    if len(typed) > MAX_TEXT:
        raise NotANumber("this is too long for a number", f"Use at most {MAX_TEXT} characters.")
    if AMBIGUOUS.fullmatch(typed):
        point, joined = typed.replace(",", "."), typed.replace(",", "")
        raise NotANumber(
            f"{typed} can mean {point} or {joined}",
            f"Type {point} with a point, or {joined} without grouping.",
        )
    if NUMBER.fullmatch(typed):
        value = float(typed.replace(",", "."))
        if not math.isfinite(value):
            raise NotANumber("this number is too large", "Check the unit and the exponent.")
        return value
    if GROUPED.fullmatch(typed):
        raise NotANumber("this number is grouped", "Type it without separators between the thousands.")
    raise NotANumber("this is not a number", "Type digits, a decimal point and, for powers of ten, 1e-3.")


def plain(value: float) -> str:
    """A number exactly, as short as it can be typed: 0.1, 532, 1e-08."""
    return str(int(value)) if value == int(value) and abs(value) < 1e15 else repr(value)


def typeset(value: float) -> str:
    """A number exactly, as people read it: 0.1, 532, 8 × 10⁻⁹."""
    text = plain(value)
    if "e" not in text and 1e-4 <= abs(value) < 1e6:
        return text
    if value == 0.0:
        return "0"
    exact = Decimal(repr(value)).normalize()
    exponent = exact.adjusted()
    mantissa = f"{exact.scaleb(-exponent):f}"
    power = f"10{str(exponent).translate(SUPERSCRIPT)}"
    return power if mantissa == "1" else f"{mantissa} × {power}"


def _shown(value: float, digits: int, rounding: str) -> str:
    if value == 0.0:
        return "0"
    rounded = Context(prec=digits, rounding=rounding).create_decimal(Decimal(repr(value)))
    exponent = rounded.adjusted()
    if -4 <= exponent < 6:
        text = f"{rounded:f}"
        return text.removesuffix(".0")
    mantissa = rounded.scaleb(-exponent)
    return f"{mantissa:f} × 10{str(exponent).translate(SUPERSCRIPT)}"


def shown_up(value: float, digits: int = 3) -> str:
    """Rounded up to significant digits: distances, ratios, densities, exposures."""
    return _shown(value, digits, ROUND_CEILING)


def shown_down(value: float, digits: int = 3) -> str:
    """Rounded down to significant digits: limits."""
    return _shown(value, digits, ROUND_FLOOR)
