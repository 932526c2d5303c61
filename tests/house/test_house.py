"""Rules of the house: size, direction of imports, types, style, what may be in the repository."""

from __future__ import annotations

import importlib
import re
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
SOURCES = sorted(p for folder in ("service", "tests") for p in (ROOT / folder).rglob("*.py"))
TEXT = {".py", ".md", ".toml", ".csv", ".html", ".css", ".js", ".svg", ".txt", ".json", ".yml", ".yaml"}


def tracked() -> list[Path]:
    """Files of the repository; every file where there is no git."""
    done = subprocess.run(["git", "ls-files", "-z"], cwd=ROOT, capture_output=True, text=True, check=False)
    names = [n for n in done.stdout.split("\0") if n]
    return [ROOT / n for n in names if (ROOT / n).is_file()]


@pytest.mark.parametrize("path", SOURCES, ids=lambda p: str(p.relative_to(ROOT)))
def test_no_module_grows_past_400_lines(path: Path) -> None:
    assert len(path.read_text(encoding="utf-8").splitlines()) <= 400


@pytest.mark.parametrize(
    "command",
    [["lint-imports"], ["mypy"], ["ruff", "check", "."], ["ruff", "format", "--check", "."]],
    ids=lambda c: " ".join(c[:2]),
)
def test_tools_are_content(command: list[str]) -> None:
    """Arrows point one way, types are strict, style is one."""
    tool = Path(sys.executable).with_name(command[0])
    done = subprocess.run([tool, *command[1:]], cwd=ROOT, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout + done.stderr


def test_public_names_are_listed_and_exist() -> None:
    """Every module of the service lists its public names and defines each."""
    for path in (p for p in SOURCES if p.is_relative_to(ROOT / "service") and p.name != "__init__.py"):
        module = importlib.import_module(".".join(path.relative_to(ROOT).with_suffix("").parts))
        assert all(hasattr(module, name) for name in module.__all__), path


def test_repository_names_no_machine_and_no_registry() -> None:
    hosts = ["py" + "pi.org", "python" + "hosted", "registry." + "npmjs", "deb." + "debian"]
    paths = ["/wo" + "rk/", "/ho" + "me/", "/fa" + "rm/"]
    pattern = re.compile("|".join(map(re.escape, hosts + paths)))
    for path in (p for p in tracked() if p.suffix in TEXT or p.name in ("Dockerfile", "run")):
        found = pattern.search(path.read_text(encoding="utf-8"))
        assert found is None, f"{path}: {found}"


def test_data_holds_only_readable_files() -> None:
    allowed = {".csv", ".toml", ".md", ".json", ".svg", ".ttf", ".otf", ".txt"}
    assert all(p.suffix in allowed for p in (ROOT / "data").rglob("*") if p.is_file())


def test_top_level_stays_as_drawn() -> None:
    allowed = {
        "README.md",
        "DEVELOPERS.md",
        "pyproject.toml",
        "Dockerfile",
        "service",
        "templates",
        "tests",
        "data",
    }
    top = {p.relative_to(ROOT).parts[0] for p in tracked()}
    assert {t for t in top if not t.startswith(".")} <= allowed
