"""The command `blinkline evaluate`: a file of lasers in, a file of records out."""

from __future__ import annotations

import argparse
import contextlib
import csv
import io
import json
import os
import sys
from collections.abc import Iterable
from pathlib import Path
from typing import IO, Any, cast

from service import __version__
from service.bulk.checkpoint import CannotGoOn, Checkpoint, Hashed
from service.bulk.flat import COLUMNS, flat_record, result_columns
from service.bulk.progress import Progress
from service.bulk.records import DETAILS, Detail, Records
from service.bulk.sources import BadFile, csv_items, ndjson_items
from service.contract.answer import rule_sets
from service.contract.classification import schemes

__all__ = ["add_command", "run"]

DONE, SOME_PROBLEMS, UNUSABLE, INTERRUPTED = 0, 1, 2, 130
CODES = """exit codes: 0 every laser was answered; 1 some have a problem in their place, the rest is answered;
2 the command, a file or the tables cannot be used; 130 interrupted (go on with --resume)"""


def add_command(commands: Any) -> None:
    """Add `evaluate` to the command line."""
    command = commands.add_parser(
        "evaluate",
        help="evaluate a file of lasers",
        description="Evaluate a file of lasers, one per line, with the same answers as the API. CSV columns: "
        + ", ".join(COLUMNS),
        epilog=CODES,
    )
    command.add_argument("file", help="CSV or NDJSON file; - reads standard input")
    command.add_argument("--from", dest="source", choices=("csv", "ndjson"), help="form of the file")
    command.add_argument("--output", "-o", type=Path, help="file to write (default: standard output)")
    command.add_argument("--to", choices=("csv", "ndjson"), help="form of the output")
    command.add_argument("--detail", choices=DETAILS, default=DETAILS[0], help="figures, or whole answers")
    command.add_argument("--rules", help="rule set of lasers that name none (default: the API's)")
    command.add_argument("--resume", action="store_true", help="go on with an output file that broke off")
    command.add_argument("--quiet", "-q", action="store_true", help="no progress on standard error")


def run(chosen: argparse.Namespace) -> int:
    """Carry the command out. Returns the exit code."""
    try:
        return _evaluate(chosen)
    except (CannotGoOn, BadFile) as error:
        print(f"blinkline: {error}", file=sys.stderr)
    except BrokenPipeError:
        # Nobody reads on; keep the interpreter from complaining when it flushes.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    except OSError as error:
        print(f"blinkline: {error.filename or chosen.file}: {error.strerror}", file=sys.stderr)
    except KeyboardInterrupt:
        hint = " Go on with --resume." if chosen.output else ""
        print(f"\nblinkline: interrupted.{hint}", file=sys.stderr)
        return INTERRUPTED
    return UNUSABLE


def _evaluate(chosen: argparse.Namespace) -> int:
    source = chosen.source or ("csv" if chosen.file.lower().endswith(".csv") else "ndjson")
    to = chosen.to or ("csv" if str(chosen.output).lower().endswith(".csv") else "ndjson")
    detail = cast(Detail, chosen.detail)
    _check(chosen, to, detail)
    with contextlib.ExitStack() as stack:
        stream = sys.stdin.buffer if chosen.file == "-" else stack.enter_context(open(chosen.file, "rb"))
        items = Hashed(csv_items(stream) if source == "csv" else ndjson_items(stream))
        checkpoint = None
        if chosen.output is not None:
            checkpoint = Checkpoint(chosen.output, _made_with(chosen, source, to))
            if chosen.resume and chosen.output.exists():
                checkpoint.go_on(items)
        out: IO[bytes] = sys.stdout.buffer
        records = Records(items, detail, chosen.rules)
        if checkpoint is not None:
            out = stack.enter_context(open(chosen.output, "r+b" if checkpoint.end else "wb"))
            # Behind the last record that is kept.
            out.seek(checkpoint.end)
            out.truncate()
            records.go_on(checkpoint.answered, checkpoint.problems, checkpoint.rules)
        size = 0 if chosen.file == "-" else os.fstat(stream.fileno()).st_size
        progress = Progress(stream, size, show=not chosen.quiet and sys.stderr.isatty())
        if to == "csv" and (checkpoint is None or not checkpoint.end):
            out.write(_csv_lines([dict(zip(result_columns(), result_columns(), strict=True))]))
        _keep(out, checkpoint, items, records)
        for chunk in records.chunks():
            out.write(_csv_lines(map(_flat, chunk)) if to == "csv" else b"\n".join(chunk) + b"\n")
            _keep(out, checkpoint, items, records)
            progress.tell(records)
        if to == "ndjson":
            out.write(records.last_line())
        out.flush()
        progress.end()
    if checkpoint is not None:
        checkpoint.clear()
    if not chosen.quiet:
        counts = f"{records.answered} answered, {records.problems} with problems"
        print(f"blinkline: {items.count} lasers, {counts}", file=sys.stderr)
    return SOME_PROBLEMS if records.problems else DONE


def _keep(out: IO[bytes], checkpoint: Checkpoint | None, items: Hashed, records: Records) -> None:
    """What is written so far is kept."""
    out.flush()
    if checkpoint is not None:
        checkpoint.save(items, records, out.tell())


def _made_with(chosen: argparse.Namespace, source: str, to: str) -> dict[str, Any]:
    """What records depend on beside the input."""
    tables = {key: compiled.rules.digest for key, compiled in rule_sets().items()}
    tables |= {key: scheme.scheme.digest for key, scheme in schemes().items()}
    options = {"--from": source, "--to": to, "--detail": chosen.detail, "--rules": chosen.rules}
    return {**options, "version": __version__, "tables": tables}


def _check(chosen: argparse.Namespace, to: str, detail: Detail) -> None:
    """Raises CannotGoOn for options that do not go together."""
    if chosen.rules is not None and chosen.rules not in rule_sets():
        raise CannotGoOn(f"there is no rule set {chosen.rules!r}; there are {', '.join(rule_sets())}")
    if to == "csv" and detail == "full":
        raise CannotGoOn("whole answers do not fit into CSV; use --to ndjson, or --detail summary")
    if chosen.resume and chosen.output is None:
        raise CannotGoOn("--resume needs --output: the file to go on with")
    if chosen.output is not None and chosen.output.exists():
        if not chosen.resume:
            raise CannotGoOn(f"{chosen.output} exists; go on with it by --resume, or name another file")
        if chosen.file != "-" and chosen.output.samefile(chosen.file):
            raise CannotGoOn("input and output are the same file")


def _flat(record: bytes) -> dict[str, Any]:
    return flat_record(json.loads(record))


def _csv_lines(rows: Iterable[dict[str, Any]]) -> bytes:
    text = io.StringIO()
    csv.DictWriter(text, result_columns(), restval="", lineterminator="\n").writerows(rows)
    return text.getvalue().encode()
