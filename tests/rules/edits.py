"""Changes to a copy of data/, one at a time, and what the refusal must name."""

from __future__ import annotations

import csv
from collections.abc import Callable
from pathlib import Path
from typing import NamedTuple

Edit = Callable[[Path], None]


def file_of(data: Path, name: str) -> Path:
    return data / ("sources.toml" if name == "sources.toml" else f"rules/{name}")


def lines_of(path: Path) -> list[list[str]]:
    with path.open(encoding="utf-8", newline="") as handle:
        return list(csv.reader(handle))


def write(path: Path, rows: list[list[str]]) -> None:
    with path.open("w", encoding="utf-8", newline="") as handle:
        csv.writer(handle, lineterminator="\n").writerows(rows)


def line_of(path: Path, row: str) -> int:
    """Line of the file on which a row stands; no cell of these tables holds a line break."""
    return next(n for n, cells in enumerate(lines_of(path), start=1) if cells[0] == row)


class Case(NamedTuple):
    """What is changed, in which file, and what the message must name: file, line and words."""

    name: str
    file: str
    edit: Edit
    words: str
    row: str | None = None
    at: str | None = None


def cell(row: str, column: str, text: str) -> Edit:
    def edit(path: Path) -> None:
        rows = lines_of(path)
        rows[line_of(path, row) - 1][rows[0].index(column)] = text
        write(path, rows)

    return edit


def header(old: str, new: str) -> Edit:
    def edit(path: Path) -> None:
        rows = lines_of(path)
        rows[0][rows[0].index(old)] = new
        write(path, rows)

    return edit


def without_column(column: str) -> Edit:
    def edit(path: Path) -> None:
        rows = lines_of(path)
        k = rows[0].index(column)
        write(path, [cells[:k] + cells[k + 1 :] for cells in rows])

    return edit


def extra_column(path: Path) -> None:
    write(path, [[*cells, "colour" if n == 0 else "red"] for n, cells in enumerate(lines_of(path))])


def repeated_column(path: Path) -> None:
    write(path, [[*cells, cells[-1]] for cells in lines_of(path)])


def without(row: str) -> Edit:
    return lambda path: write(path, [c for c in lines_of(path) if c[0] != row])


def again(row: str, name: str | None = None) -> Edit:
    """The row a second time, at the end, under the same or another name."""

    def edit(path: Path) -> None:
        rows = lines_of(path)
        copy = list(rows[line_of(path, row) - 1])
        copy[0] = name or row
        write(path, [*rows, copy])

    return edit


def short_row(row: str) -> Edit:
    def edit(path: Path) -> None:
        rows = lines_of(path)
        rows[line_of(path, row) - 1].pop()
        write(path, rows)

    return edit


def text(old: str, new: str) -> Edit:
    def edit(path: Path) -> None:
        content = path.read_text(encoding="utf-8")
        assert old in content
        path.write_text(content.replace(old, new, 1), encoding="utf-8")

    return edit


def everywhere(old: str, new: str) -> Edit:
    def edit(path: Path) -> None:
        content = path.read_text(encoding="utf-8")
        assert old in content
        path.write_text(content.replace(old, new), encoding="utf-8")

    return edit


def only_header(path: Path) -> None:
    write(path, lines_of(path)[:1])
