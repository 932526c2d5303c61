"""The console command ``blinkline``."""

from __future__ import annotations

import argparse
import socket
import sys

import uvicorn
from fastapi import FastAPI

from service import __version__, register_commands
from service.app import create_app
from service.contract.problem import Problem
from service.register.database import shown_url
from service.rules.tables import TableError
from service.settings import Settings, SettingsError

__all__ = ["main"]


def main(arguments: list[str] | None = None) -> int:
    """Run a command. Returns the exit code: 0 done, 2 something could not be used."""
    parser = argparse.ArgumentParser(prog="blinkline", description="Laser hazard evaluation service.")
    parser.add_argument("--version", action="version", version=f"blinkline {__version__}")
    commands = parser.add_subparsers(dest="command", required=True)
    serve = commands.add_parser("serve", help="serve pages and API")
    serve.add_argument("--host", help="address to listen on (default: BLINKLINE_HOST or 127.0.0.1)")
    serve.add_argument("--port", type=int, help="port to listen on (default: BLINKLINE_PORT or 8321)")
    register_commands.add_commands(commands)
    chosen = parser.parse_args(arguments)
    try:
        settings = Settings.from_environment()
        if chosen.command != "serve":
            return register_commands.run(chosen, settings)
        app = create_app(settings)
    except (SettingsError, TableError) as error:
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
    # What a proxy forwards is read by the register itself, from the proxies named in the settings.
    config = uvicorn.Config(app, log_level="warning", server_header=False, proxy_headers=False)
    uvicorn.Server(config).run(sockets=[listener])
    return 0


def _open_register(app: FastAPI) -> None:
    """Open the register, or tell why it stays closed: evaluations work without."""
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
    except BaseException:
        listener.close()
        raise
    return listener


if __name__ == "__main__":
    raise SystemExit(main())
