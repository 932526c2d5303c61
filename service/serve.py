"""`blinkline serve`: one process, or several workers behind one address."""

from __future__ import annotations

import argparse
import os
import shutil
import socket
import sys
import tempfile
from typing import Any

import uvicorn
from fastapi import FastAPI
from uvicorn.supervisors import Multiprocess

from service import __version__
from service.app import create_app
from service.contract.problem import Problem
from service.garbage import settle
from service.logs import configure
from service.register.database import shown_url
from service.rules.tables import TableError
from service.settings import Settings, SettingsError
from service.web.metrics import SHARED
from service.web.patience import Patient

__all__ = ["add_command", "application", "run"]

#: After a signal to stop, requests that run are finished for at most this long [s].
PATIENCE_S = 30
MOST_WORKERS = 64


def add_command(commands: Any) -> None:
    """Add `serve` to the command line."""
    serve = commands.add_parser("serve", help="serve pages and API")
    serve.add_argument("--host", help="address to listen on (default: BLINKLINE_HOST or 127.0.0.1)")
    serve.add_argument("--port", type=int, help="port to listen on (default: BLINKLINE_PORT or 8321)")
    serve.add_argument(
        "--workers", type=int, default=1, help="processes that serve side by side (default: 1)"
    )


def application() -> FastAPI:
    """The application of one process, with the settings of the environment."""
    settings = Settings.from_environment()
    configure(settings.log)
    Patient.seconds = settings.request_time
    app = create_app(settings)
    settle()
    return app


def run(chosen: argparse.Namespace) -> int:
    """Serve until told to stop; requests that run are finished first. Returns the exit code."""
    try:
        if not 1 <= chosen.workers <= MOST_WORKERS:
            raise SettingsError(f"--workers is {chosen.workers}, expected 1 to {MOST_WORKERS}")
        settings = Settings.from_environment()
        app = application()
    except (SettingsError, TableError, OSError) as error:
        print(f"blinkline: {error}", file=sys.stderr)
        return 2
    host, port = chosen.host or settings.host, settings.port if chosen.port is None else chosen.port
    try:
        listener = _listen(host, port)
    except (OSError, OverflowError) as error:
        print(f"blinkline: cannot listen on {host} port {port}: {error}", file=sys.stderr)
        return 2
    _open_register(app)
    print(f"Blinkline {__version__} on http://{host}:{listener.getsockname()[1]}", flush=True)
    options: dict[str, Any] = {
        "log_config": None,
        "access_log": False,
        "server_header": False,
        # What a proxy forwards is read by the register itself, from the proxies named in the settings.
        "proxy_headers": False,
        "timeout_graceful_shutdown": PATIENCE_S,
        "http": Patient,
    }
    if chosen.workers == 1:
        uvicorn.Server(uvicorn.Config(app, **options)).run(sockets=[listener])
        return 0
    app.state.register.close()
    shared = os.environ[SHARED] = tempfile.mkdtemp(prefix="blinkline-")
    try:
        config = uvicorn.Config("service.serve:application", factory=True, workers=chosen.workers, **options)
        Multiprocess(config, sockets=[listener]).run()
    finally:
        shutil.rmtree(shared, ignore_errors=True)
    return 0


def _open_register(app: FastAPI) -> None:
    """Bring the register's tables up to date, or tell why it stays closed: evaluations work without.

    Workers start afterwards and find the tables as they are to be.
    """
    try:
        app.state.register.open()
    except Problem as problem:
        place = shown_url(app.state.register.url)
        print(f"blinkline: no register at {place}: {problem.detail}", file=sys.stderr, flush=True)


def _listen(host: str, port: int) -> socket.socket:
    """A listening socket. Raises OSError or OverflowError where address or port cannot be used."""
    family = socket.AF_INET6 if ":" in host else socket.AF_INET
    listener = socket.socket(family, socket.SOCK_STREAM)
    try:
        listener.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
        listener.bind((host, port))
        listener.listen()
    except BaseException:
        listener.close()
        raise
    return listener
