"""What differs between two revisions: inputs and results, field by field."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

from service.register.models import Figures

__all__ = ["Change", "differences", "figures_changed", "figures_differences"]

#: Figures whose change an LSO has to see.
WATCHED = (
    *("hazard_classes", "eye_hazard_distance_m", "skin_hazard_distance_m", "optical_density"),
    *("aided", "stopped", "stopped_aided", "stopped_skin_hazard_distance_m"),
)
#: Distances and densities that differ by less than this share are the same.
SLACK = 1e-9
MISSING = object()


@dataclass(frozen=True, slots=True)
class Change:
    """One field, old and new; None where there is none."""

    field: str
    old: Any
    new: Any


def differences(old: dict[str, Any], new: dict[str, Any]) -> list[Change]:
    """Fields of two documents that differ, in the order of their paths; lists by position."""
    before, after = dict(_flat(old)), dict(_flat(new))
    names = list(before) + [n for n in after if n not in before]
    return [
        Change(n, before.get(n), after.get(n))
        for n in names
        if before.get(n, MISSING) != after.get(n, MISSING)
    ]


def figures_differences(old: Figures, new: Figures) -> list[Change]:
    """Figures that differ."""
    return differences(old.model_dump(mode="json"), new.model_dump(mode="json"))


def figures_changed(old: Figures, new: Figures) -> bool:
    """Whether class, distance or density changed."""
    return any(not _same(getattr(old, name), getattr(new, name)) for name in WATCHED)


def _same(a: Any, b: Any) -> bool:
    if isinstance(a, float) and isinstance(b, float):
        return abs(a - b) <= SLACK * max(abs(a), abs(b))
    return bool(a == b)


def _flat(value: Any, path: str = "") -> Iterator[tuple[str, Any]]:
    """Leaves of a document with their paths; a list of plain numbers is one leaf."""
    if isinstance(value, dict) and value:
        for name, inner in value.items():
            yield from _flat(inner, f"{path}.{name}" if path else name)
    elif isinstance(value, list) and any(isinstance(v, dict | list) for v in value):
        for n, inner in enumerate(value):
            yield from _flat(inner, f"{path}.{n}" if path else str(n))
    else:
        yield path, value
