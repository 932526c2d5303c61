"""The console commands of the register: its tables, backups, checks, CSV and users."""

from __future__ import annotations

import argparse
import getpass
import sys
from pathlib import Path

from pydantic import ValidationError

from service.contract.answer import rule_sets
from service.contract.classification import schemes
from service.contract.problem import Problem
from service.register import accounts
from service.register.accounts import UserIn
from service.register.actor import ROLES, Actor
from service.register.backup import BackupError, backup, check, restore
from service.register.database import Database, database_url, shown_url
from service.register.importing import import_all
from service.register.listing import Filters
from service.rules.tables import TableError
from service.settings import Settings, SettingsError
from service.web.register.csv_columns import exported
from service.web.register.csv_read import read_csv

__all__ = ["add_commands", "run"]


class _Refused(ValueError):
    """What was typed cannot be used."""


ACTOR = Actor("command line", "admin", "command")


def add_commands(commands: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    """Add `register` and `user` to the commands."""
    register = commands.add_parser("register", help="tables, backups and checks of the register")
    actions = register.add_subparsers(dest="action", required=True)
    actions.add_parser("migrate", help="bring the tables up to date (serve does it by itself)")
    actions.add_parser("check", help="check digests, the audit chain and the database")
    for name, text in (
        ("backup", "write a backup, also while the service runs"),
        ("restore", "fill an empty register from a backup"),
        ("import", "import lasers from CSV, all or none"),
        ("export", "export every laser as CSV"),
    ):
        actions.add_parser(name, help=text).add_argument("file", type=Path)
    user = commands.add_parser("user", help="users of the register")
    steps = user.add_subparsers(dest="action", required=True)
    steps.add_parser("list", help="users and roles")
    for name, text in (
        ("add", "add a user; the password is asked for, or read from standard input"),
        ("password", "set a new password"),
        ("role", "change the role"),
        ("stop", "stop a user from signing in"),
        ("start", "let a user sign in again"),
    ):
        step = steps.add_parser(name, help=text)
        step.add_argument("name")
        if name in ("add", "role"):
            step.add_argument("--role", choices=ROLES, required=True)
        if name == "add":
            step.add_argument("--no-password", action="store_true", help="sign-in by proxy or token only")


def run(chosen: argparse.Namespace) -> int:
    """Run one of the commands. Returns the exit code: 0 done, 1 the check found something, 2 failed."""
    try:
        settings = Settings.from_environment()
        rule_sets()
        schemes()
    except (SettingsError, TableError) as error:
        print(f"blinkline: {error}", file=sys.stderr)
        return 2
    database = Database(database_url(settings.database, settings.data_dir))
    try:
        if chosen.action != "restore":
            database.open()
        return _user(chosen, database) if chosen.command == "user" else _register(chosen, database)
    except Problem as problem:
        print(f"blinkline: {problem.detail}", file=sys.stderr)
        for e in problem.errors:
            print(f"  {e.field}: {e.message} (allowed: {e.allowed})", file=sys.stderr)
    except ValidationError as error:
        first = error.errors(include_url=False)[0]
        print(f"blinkline: {'.'.join(map(str, first['loc']))}: {first['msg']}", file=sys.stderr)
    except (BackupError, _Refused, OSError) as error:
        print(f"blinkline: {error}", file=sys.stderr)
    finally:
        database.close()
    return 2


def _register(chosen: argparse.Namespace, database: Database) -> int:
    name = shown_url(database.url)
    if chosen.action == "migrate":
        print(f"the tables in {name} are up to date")
    elif chosen.action == "check":
        found = check(database)
        print("\n".join(found) if found else f"nothing is wrong with {name}")
        return 1 if found else 0
    elif chosen.action in ("backup", "restore"):
        counts = (backup if chosen.action == "backup" else restore)(database, chosen.file)
        told = ", ".join(f"{n} {t}" for t, n in counts.items() if n)
        print(f"{'wrote' if chosen.action == 'backup' else 'restored'} {told or 'an empty register'}")
    elif chosen.action == "import":
        done = import_all(database, ACTOR, read_csv(chosen.file.read_bytes()))
        print(f"created {done.created}, changed {done.changed}, unchanged {done.unchanged}")
    else:
        with chosen.file.open("w", encoding="utf-8", newline="") as out:
            out.writelines(exported(database, Filters()))
        print(f"wrote {chosen.file}")
    return 0


def _password() -> str:
    if sys.stdin.isatty():
        first = getpass.getpass("Password: ")
        if getpass.getpass("Again: ") != first:
            raise _Refused("the passwords differ")
        return first
    return sys.stdin.readline().rstrip("\n")


def _user(chosen: argparse.Namespace, database: Database) -> int:
    if chosen.action == "list":
        with database.read() as connection:
            for user in accounts.users_list(connection):
                print(f"{user.name}\t{user.role}\t{'active' if user.active else 'stopped'}")
        return 0
    secret = ""
    if chosen.action == "password" or (chosen.action == "add" and not chosen.no_password):
        secret = _password()
    with database.write() as connection:
        if chosen.action == "add":
            body = UserIn(name=chosen.name, role=chosen.role, password=secret or None)
            accounts.add_user(connection, ACTOR, body)
        else:
            known = {u.name: u.id for u in accounts.users_list(connection)}
            if chosen.name not in known:
                raise _Refused(f"there is no user {chosen.name!r}")
            if chosen.action == "password":
                accounts.set_password(connection, ACTOR, known[chosen.name], secret)
            elif chosen.action == "role":
                accounts.change_user(connection, ACTOR, known[chosen.name], role=chosen.role)
            else:
                accounts.change_user(connection, ACTOR, known[chosen.name], active=chosen.action == "start")
    print("done")
    return 0
