"""Columns over the processes of a cluster: parts are made, evaluated and condensed where they are computed.

Any executor with the `submit` of `concurrent.futures` will do: a `distributed.Client` (extra `cluster`) for
several machines, a `ProcessPoolExecutor` for one.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Callable, Iterator, Mapping
from typing import Any, Protocol, TypeVar

from service.columns import Column, evaluate_columns

__all__ = ["Executor", "evaluate_parts"]

T = TypeVar("T")


class Executor(Protocol):
    """What computes parts elsewhere."""

    def submit(self, fn: Callable[..., Any], /, *args: Any) -> Any:
        """A future, whose `result()` is that of the call."""


def evaluate_parts(
    executor: Executor,
    make: Callable[[int], Mapping[str, Any]],
    keep: Callable[[Mapping[str, Any], dict[str, Column]], T],
    parts: int,
    ahead: int = 8,
) -> Iterator[T]:
    """Evaluate a table in parts, each in one process, and give what is kept of each, in order.

    Only part numbers and what `keep` returns travel, so that a table of any length needs the memory of
    `ahead` parts.

    Parameters
    ----------
    make : the columns of a part by its number, as `evaluate_columns` takes them: drawn, computed, or read
        from a file of that number
    keep : what is kept of a part's columns and results: a few numbers, or the name of a file that it writes
    parts : number of parts
    ahead : parts that are submitted at a time; twice the number of processes keeps all of them busy

    Raises what `make`, `keep` or `evaluate_columns` raises, for the first part where one does.
    """
    running: deque[Any] = deque()
    for part in range(parts):
        running.append(executor.submit(_one, make, keep, part))
        if len(running) >= ahead:
            yield running.popleft().result()
    while running:
        yield running.popleft().result()


def _one(
    make: Callable[[int], Mapping[str, Any]],
    keep: Callable[[Mapping[str, Any], dict[str, Column]], T],
    part: int,
) -> T:
    columns = make(part)
    return keep(columns, evaluate_columns(columns))
