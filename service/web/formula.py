"""Formulas as people read them: subscripts, superscripts and powers of ten."""

from __future__ import annotations

import re
from itertools import accumulate

from markupsafe import Markup, escape

__all__ = ["formula", "power_of_ten"]

GREEK = {"lambda": "λ", "alpha": "α", "gamma": "γ", "phi": "φ"}
INDEX = re.compile(r"\b(AEL|LB|C|E|F|P|Q|T|t|H|d|τ|γ|α|λ|gamma|alpha|z|n)_([A-Za-z0-9]+)\b")
SQUARE_METRE = re.compile(r"\bm2\b")
GREEK_WORD = re.compile(r"\b(lambda|alpha|gamma|phi)(?=_|\b)")
EXPONENT = re.compile(r"\b(\d+(?:\.\d+)?)e([+-]?\d+)\b(?=(\^?))")


def _power(match: re.Match[str]) -> str:
    mantissa, exponent = match[1], str(int(match[2])).replace("-", "−")
    text = f"{'' if mantissa == '1' else mantissa + ' × '}10<sup>{exponent}</sup>"
    return f"({text})" if match[3] else text


def power_of_ten(text: str) -> Markup:
    """A number such as 3e+10 or 1e-09 as 3 × 10 to a power; anything else as it is."""
    return Markup(EXPONENT.sub(_power, str(escape(text))))


def _superscripts(text: str) -> str:
    """Every ^ with the number, name or bracket that follows it as a superscript."""
    parts, rest = [], text
    while "^" in rest:
        before, _, rest = rest.partition("^")
        if rest.startswith("("):
            depths = list(accumulate((c == "(") - (c == ")") for c in rest))
            end = depths.index(0) if 0 in depths else len(rest)
            inner, rest = rest[1:end], rest[end + 1 :]
        else:
            match = re.match(r"-?[\w.]+", rest)
            inner, rest = (match[0], rest[match.end() :]) if match else ("", rest)
        parts.append(f"{before}<sup>{_superscripts(inner).replace('-', '−')}</sup>")
    return "".join(parts) + rest


def formula(text: str) -> Markup:
    """An expression of the working or of a table: C_A, t^0.75, 10^(...), 'x' between factors."""
    typeset = str(power_of_ten(text)).replace(" x ", " × ").replace("&gt;=", "≥")
    typeset = GREEK_WORD.sub(lambda m: GREEK[m[1]], typeset)
    typeset = SQUARE_METRE.sub("m²", typeset)
    typeset = INDEX.sub(r"\1<sub>\2</sub>", typeset)
    return Markup(_superscripts(typeset))
