"""The printed working read back: expressions and numbers in the text of a step."""

from __future__ import annotations

import ast
import math
import re
from collections.abc import Mapping
from typing import Any

__all__ = ["evaluated", "numbers_of", "printed_limit", "steps_of"]

NUMBER = r"-?\d+(?:\.\d+)?(?:e[+-]?\d+)?"
OPERATIONS = {
    ast.Add: lambda a, b: a + b,
    ast.Sub: lambda a, b: a - b,
    ast.Mult: lambda a, b: a * b,
    ast.Div: lambda a, b: a / b,
    ast.Pow: lambda a, b: a**b,
}
FUNCTIONS = {"max": max, "min": min, "log10": math.log10, "ln": math.log, "sqrt": math.sqrt}


def evaluated(text: str, values: Mapping[str, float] | None = None) -> float:
    """An expression as printed: x between factors, ^ for powers, names from `values`."""
    code = text.replace(" x ", " * ").replace("^", "**")
    return _value(ast.parse(code.strip(), mode="eval").body, values or {})


def _value(node: ast.expr, values: Mapping[str, float]) -> float:
    if isinstance(node, ast.Constant):
        return float(node.value)  # type: ignore[arg-type]
    if isinstance(node, ast.Name):
        return values[node.id]
    if isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.USub):
        return -_value(node.operand, values)
    if isinstance(node, ast.BinOp):
        return float(OPERATIONS[type(node.op)](_value(node.left, values), _value(node.right, values)))
    if isinstance(node, ast.Call) and isinstance(node.func, ast.Name):
        return float(FUNCTIONS[node.func.id](*(_value(a, values) for a in node.args)))
    raise ValueError(f"not an expression: {ast.dump(node)}")


def numbers_of(text: str, *patterns: str) -> list[float]:
    """One number per pattern; # stands for the number."""
    found = []
    for pattern in patterns:
        match = re.search(re.escape(pattern).replace(re.escape("#"), f"({NUMBER})"), text)
        assert match, f"{pattern} is not in {text!r}"
        found.append(float(match[1]))
    return found


def printed_limit(text: str, values: Mapping[str, float]) -> float:
    """The limit [J/m2] in a text such as '... at 100 s: (10 x C_A) W/m2 x 100 s, at most 1000 W/m2'."""
    expression, _, cap = text.partition(": ")[2].partition(", at most ")
    irradiance = re.fullmatch(rf"\((.+)\) W/m2 x ({NUMBER}) s", expression)
    if irradiance is None:
        value = evaluated(expression, values)
        return min(value, float(cap.removesuffix(" J/m2"))) if cap else value
    per_second = evaluated(irradiance[1], values)
    if cap:
        per_second = min(per_second, float(cap.removesuffix(" W/m2")))
    return per_second * float(irradiance[2])


def steps_of(answer: dict[str, Any], **place: Any) -> list[dict[str, Any]]:
    """The steps of one place: line, target, criterion."""
    return [s for s in answer["working"] if all(s[k] == v for k, v in place.items())]
