"""How far a file has got: kept beside the output until it is complete, so that the work can go on."""

from __future__ import annotations

import hashlib
import json
import os
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from service.bulk.records import Records
from service.contract.problem import Problem

__all__ = ["CannotGoOn", "Checkpoint", "Hashed"]


class CannotGoOn(ValueError):
    """The command cannot be carried out; the message says why and what to do."""


class Hashed:
    """Items as they pass, with a digest of all so far."""

    def __init__(self, items: Iterator[Any]) -> None:
        self._items, self._hash, self.count = items, hashlib.sha256(), 0

    def __iter__(self) -> Iterator[Any]:
        return self

    def __next__(self) -> Any:
        item = next(self._items)
        self._hash.update(item if isinstance(item, bytes) else _text(item).encode())
        self._hash.update(b"\n")
        self.count += 1
        return item

    def digest(self) -> str:
        """Digest of the items so far."""
        return self._hash.hexdigest()


def _text(item: Any) -> str:
    return f"{item.detail} {item.errors}" if isinstance(item, Problem) else repr(item)


class Checkpoint:
    """The state beside an output file.

    `made_with` holds what the records depend on beside the input: options and digests of the tables.
    """

    def __init__(self, output: Path, made_with: dict[str, Any]) -> None:
        self.path = output.with_name(output.name + ".progress")
        self._output, self._made_with = output, made_with
        self.answered = self.problems = self.end = 0
        self.rules: list[str] = []

    def save(self, items: Hashed, records: Records, end: int) -> None:
        """Keep that the records up to byte `end` of the output are those of the items so far."""
        state = {
            "made_with": self._made_with,
            "items": items.digest(),
            "answered": records.answered,
            "problems": records.problems,
            "rules": list(records.rules),
            "end": end,
        }
        new = self.path.with_name(self.path.name + ".new")
        new.write_text(json.dumps(state), encoding="utf-8")
        os.replace(new, self.path)

    def go_on(self, items: Hashed) -> None:
        """Pass over the items that are answered; the counts so far are then known.

        Raises CannotGoOn where they, the options or the tables are not those that made the output.
        """
        try:
            state = json.loads(self.path.read_text(encoding="utf-8"))
            done, digest, made_with = (
                state["answered"] + state["problems"],
                state["items"],
                state["made_with"],
            )
            self.answered, self.problems, self.end = state["answered"], state["problems"], state["end"]
            self.rules = state["rules"]
            size = self._output.stat().st_size
        except FileNotFoundError:
            raise CannotGoOn(
                f"{self._output} has no {self.path.name} beside it: it is complete, or was not made by this "
                "command"
            ) from None
        except (ValueError, KeyError, TypeError):
            raise CannotGoOn(f"{self.path} cannot be read; start anew with another output") from None
        for name, value in self._made_with.items():
            if made_with.get(name) != value:
                raise CannotGoOn(f"{self._output} was made with {name} {made_with.get(name)}, not {value}")
        for _ in range(done):
            next(items, None)
        if items.digest() != digest or self.end > size:
            raise CannotGoOn(
                f"{self._output} was made from another input: what was read so far has changed. Start anew "
                "with another output"
            )

    def clear(self) -> None:
        """The output is complete."""
        self.path.unlink(missing_ok=True)
