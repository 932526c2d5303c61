"""The console commands of the register."""

from __future__ import annotations

import io
from pathlib import Path

import pytest

from service.cli import main
from tests.register.test_csv import ROW, table


class Console:
    """Runs commands against a register in a folder."""

    def __init__(self, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
        self.monkeypatch, self.capsys = monkeypatch, capsys

    def __call__(self, *arguments: str, typed: str = "") -> tuple[int, str, str]:
        self.monkeypatch.setattr("sys.stdin", io.StringIO(typed))
        code = main(list(arguments))
        out, err = self.capsys.readouterr()
        return code, out, err


@pytest.fixture
def console(address: str, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Console:
    monkeypatch.setenv("BLINKLINE_DATABASE", address)
    return Console(monkeypatch, capsys)


def test_users(console: Console) -> None:
    assert console("user", "list") == (0, "", "")
    assert console("user", "add", "lso", "--role", "admin", typed="a long password\n")[0] == 0
    assert console("user", "add", "robot", "--role", "editor", "--no-password")[0] == 0
    assert console("user", "role", "robot", "--role", "viewer")[0] == 0
    assert console("user", "stop", "robot")[0] == 0
    assert console("user", "list")[1] == "lso\tadmin\tactive\nrobot\tviewer\tstopped\n"
    for arguments, typed, words in (
        (("add", "lso", "--role", "admin"), "another password\n", "is taken"),
        (("add", "x", "--role", "admin"), "short\n", "too short"),
        (("stop", "lso"), "", "last admin"),
        (("stop", "nobody"), "", "no user"),
        (("password", "lso"), "short\n", "too short"),
    ):
        code, out, err = console("user", *arguments, typed=typed)
        assert (code, out) == (2, "")
        assert words in err
        assert "Traceback" not in err
    assert console("user", "password", "lso", typed="a better password\n")[0] == 0


def test_import_check_backup_restore(
    console: Console, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    file = tmp_path / "lasers.csv"
    file.write_text(table(ROW.format(n=1), ROW.format(n=2)))
    assert console("register", "import", str(file)) == (0, "created 2, changed 0, unchanged 0\n", "")
    code, out, _ = console("register", "check")
    assert (code, out.startswith("nothing is wrong")) == (0, True)
    saved = tmp_path / "saved"
    assert console("register", "backup", str(saved))[0] == 0
    monkeypatch.setenv("BLINKLINE_DATABASE", "")
    monkeypatch.setenv("BLINKLINE_DATA_DIR", str(tmp_path / "new"))
    code, out, _ = console("register", "restore", str(saved))
    assert (code, "2 lasers" in out) == (0, True)
    code, out, err = console("register", "restore", str(saved))
    assert (code, out, "not empty" in err) == (2, "", True)
    back = tmp_path / "back.csv"
    assert console("register", "export", str(back))[0] == 0
    assert console("register", "import", str(back))[1] == "created 0, changed 0, unchanged 2\n"
    assert console("register", "migrate")[0] == 0


def test_what_cannot_be_used_is_told_in_words(console: Console, tmp_path: Path) -> None:
    file = tmp_path / "lasers.csv"
    file.write_text(table(ROW.format(n=1).replace("532", "x")))
    code, out, err = console("register", "import", str(file))
    assert (code, out) == (2, "")
    assert "row 2, wavelength_nm" in err
    for arguments in (("import", "nowhere.csv"), ("restore", "nowhere"), ("backup", "/proc/no/where")):
        code, out, err = console("register", *arguments)
        assert (code, out) == (2, "")
        assert err.startswith("blinkline: ")
        assert "Traceback" not in err
