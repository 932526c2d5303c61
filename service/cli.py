"""The console command ``blinkline``."""

from __future__ import annotations

import argparse
import sys

from service import __version__, register_commands, serve
from service.bulk import command as evaluate
from service.contract.answer import rule_sets
from service.contract.classification import schemes
from service.garbage import settle
from service.rules.tables import TableError

__all__ = ["main"]


def main(arguments: list[str] | None = None) -> int:
    """Run a command. Returns the exit code: 0 done, 2 something could not be used."""
    parser = argparse.ArgumentParser(prog="blinkline", description="Laser hazard evaluation service.")
    parser.add_argument("--version", action="version", version=f"blinkline {__version__}")
    commands = parser.add_subparsers(dest="command", required=True)
    serve.add_command(commands)
    evaluate.add_command(commands)
    register_commands.add_commands(commands)
    chosen = parser.parse_args(arguments)
    if chosen.command == "serve":
        return serve.run(chosen)
    return _evaluate(chosen) if chosen.command == "evaluate" else register_commands.run(chosen)


def _evaluate(chosen: argparse.Namespace) -> int:
    """Evaluate a file. Returns the exit code."""
    try:
        rule_sets()
        schemes()
    except (TableError, OSError) as error:
        print(f"blinkline: {error}", file=sys.stderr)
        return 2
    settle()
    return evaluate.run(chosen)


if __name__ == "__main__":
    raise SystemExit(main())
