"""`blinkline evaluate`: the answers of the API, exit codes, and going on where it broke off."""

from __future__ import annotations

import csv
import io
import json
import math
import signal
import subprocess
import time
from pathlib import Path
from typing import Any

import pytest

from service import cli
from service.bulk import command
from service.bulk.checkpoint import Checkpoint
from service.bulk.records import Records, body_lines
from tests.web.client import GOOD, changed
from tests.web.test_cli import COMMAND, PATIENCE_S, environment
from tests.web.test_random_requests import requests

CSV = """label,wavelength_nm,mode,power_w,energy_j,pulse_s,diameter_mm,divergence_mrad,divergence_y_mrad
green,532,cw,0.1,,,2,1,
"infra, red",1064,pulse,,0.05,1e-8,6,0.5,0.8
"""


def ndjson(*bodies: Any) -> bytes:
    return b"".join(json.dumps(body).encode() + b"\n" for body in bodies)


def run(*arguments: object) -> int:
    return cli.main(["evaluate", *map(str, arguments)])


def rows(path: Path) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(path.read_text(encoding="utf-8"), newline="")))


@pytest.fixture
def many(tmp_path: Path) -> Path:
    """A file of several passes, some of its requests not usable."""
    path = tmp_path / "many.ndjson"
    bodies = [body for body in requests(31) if len(body["lines"]) == 1][:40]
    bodies.append(changed("lines.0.wavelength_nm", 20))
    path.write_bytes(ndjson(*(bodies * 60)[:2300]))
    return path


def test_answers_are_those_of_the_stream(
    many: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    expected = b"".join(Records(body_lines(many.read_bytes()), "summary").lines())
    out = tmp_path / "out.ndjson"
    assert run(many, "--output", out) == 1
    assert out.read_bytes() == expected
    assert "2300 lasers" in capsys.readouterr().err
    assert sorted(p.name for p in tmp_path.iterdir()) == ["many.ndjson", "out.ndjson"]


def test_csv_rows_are_requests(tmp_path: Path) -> None:
    table, same = tmp_path / "in.csv", tmp_path / "in.ndjson"
    table.write_text(CSV, encoding="utf-8")
    green = {
        "label": "green",
        "lines": [
            {
                "wavelength_nm": 532,
                "emission": {"mode": "cw", "power_w": 0.1},
                "beam": {"diameter_mm": 2, "divergence_mrad": 1},
            }
        ],
    }
    infrared = {
        "label": "infra, red",
        "lines": [
            {
                "wavelength_nm": 1064,
                "emission": {"mode": "pulse", "energy_j": 0.05, "pulse_s": 1e-8},
                "beam": {"diameter_mm": 6, "divergence_mrad": [0.5, 0.8]},
            }
        ],
    }
    same.write_bytes(ndjson(green, infrared))
    for detail in ("summary", "full"):
        one, two = tmp_path / f"one-{detail}.ndjson", tmp_path / f"two-{detail}.ndjson"
        assert run(table, "-o", one, "--detail", detail) == 0
        assert run(same, "-o", two, "--detail", detail) == 0
        assert one.read_bytes() == two.read_bytes()


def test_csv_out_holds_the_same_figures(many: Path, tmp_path: Path) -> None:
    one, two = tmp_path / "one.csv", tmp_path / "two.ndjson"
    assert run(many, "-o", one) == run(many, "-o", two) == 1
    *records, _ = [json.loads(line) for line in two.read_bytes().splitlines()]
    for row, record in zip(rows(one), records, strict=True):
        if "problem" in record:
            assert row["problem"].startswith(record["problem"]["detail"])
            assert row["eye_hazard_distance_m"] == row["class_us_21cfr1040"] == ""
            continue
        for target in ("eye", "skin"):
            far = record[target]["hazard_distance_m"]
            assert float(row[f"{target}_hazard_distance_m"]) == (math.inf if far is None else far)
            assert float(row[f"{target}_hazard_ratio"]) == record[target]["hazard_ratio"]
            assert float(row[f"{target}_optical_density"]) == record[target]["optical_density"]
            assert row[f"{target}_row"] == record[target]["governing"]["row"]
        assert row["class_iec_60825_1_2014"] == record["classes"]["iec-60825-1-2014"]
        assert row["notices"].split() == record["notices"]


def test_it_goes_on_where_it_broke_off(
    many: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """Stopped between two passes, with half a record behind the last whole one."""
    for name in ("out.ndjson", "out.csv"):
        whole, broken = tmp_path / f"whole-{name}", tmp_path / name
        assert run(many, "-o", whole) == 1
        real = Records.chunks

        def stopping(self: Records, real: Any = real) -> Any:
            for n, chunk in enumerate(real(self)):
                if n == 1:
                    raise KeyboardInterrupt
                yield chunk

        monkeypatch.setattr(Records, "chunks", stopping)
        assert run(many, "-o", broken) == 130
        monkeypatch.undo()
        assert "--resume" in capsys.readouterr().err
        with broken.open("ab") as stream:
            stream.write(b'{"index":1000,"la')
        assert run(many, "-o", broken, "--resume") == 1
        assert broken.read_bytes() == whole.read_bytes()
        assert not broken.with_name(f"{name}.progress").exists()


def test_it_does_not_go_on_with_what_does_not_fit(
    many: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """Other input, other options or other tables: a mixture is never written."""
    out, kept = tmp_path / "out.ndjson", many.read_bytes()
    monkeypatch.setattr(Checkpoint, "clear", lambda self: None)
    assert run(many, "-o", out) == 1
    before = out.read_bytes()
    many.write_bytes(kept.replace(b"532", b"533").replace(b'"cw"', b'"cw "', 1))
    assert run(many, "-o", out, "--resume") == 2
    assert "another input" in capsys.readouterr().err
    many.write_bytes(kept)
    assert run(many, "-o", out, "--resume", "--detail", "full") == 2
    assert "--detail summary, not full" in capsys.readouterr().err
    assert run(many, "-o", out, "--resume", "--rules", "eu-2006-25") == 2
    monkeypatch.setattr(command, "_made_with", lambda *given: {"tables": {"icnirp-2013": "sha256:0"}})
    assert run(many, "-o", out, "--resume") == 2
    assert "tables" in capsys.readouterr().err
    assert out.read_bytes() == before


def test_a_complete_output_is_not_gone_on_with(
    many: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    out = tmp_path / "out.ndjson"
    assert run(many, "-o", out) == 1
    before = out.read_bytes()
    assert run(many, "-o", out, "--resume") == 2
    assert "complete" in capsys.readouterr().err
    assert run(many, "-o", out) == 2
    assert "exists" in capsys.readouterr().err
    assert out.read_bytes() == before


def test_killed_in_the_middle_it_goes_on(tmp_path: Path) -> None:
    """A process that is killed leaves what it has written, and the next goes on with it."""
    source, out = tmp_path / "in.ndjson", tmp_path / "out.ndjson"
    source.write_bytes(ndjson(GOOD) * 12_000)
    done = subprocess.Popen(
        [COMMAND, "evaluate", source, "-o", out], env=environment(), stderr=subprocess.PIPE
    )
    end = time.monotonic() + PATIENCE_S
    while not (out.exists() and out.stat().st_size > 10_000) and time.monotonic() < end:
        time.sleep(0.02)
    done.send_signal(signal.SIGKILL)
    done.communicate(timeout=PATIENCE_S)
    assert done.returncode == -signal.SIGKILL
    assert run(source, "-o", out, "--resume", "--quiet") == 0
    *records, closing = [json.loads(line) for line in out.read_bytes().splitlines()]
    assert [record["index"] for record in records] == list(range(12_000))
    assert closing["closing"]["answered"] == 12_000


def test_pipes(tmp_path: Path) -> None:
    def piped(content: bytes, *arguments: str) -> subprocess.CompletedProcess[bytes]:
        return subprocess.run(
            [COMMAND, "evaluate", "-", *arguments],
            input=content,
            cwd=tmp_path,
            env=environment(),
            capture_output=True,
            timeout=PATIENCE_S,
            check=False,
        )

    done = piped(ndjson(GOOD, changed("lines", [])))
    assert done.returncode == 1
    assert [("problem" in json.loads(line)) for line in done.stdout.splitlines()] == [False, True, False]
    assert done.stderr == b"blinkline: 2 lasers, 1 answered, 1 with problems\n"
    done = piped(CSV.encode(), "--from", "csv", "--to", "csv", "--quiet")
    assert (done.returncode, done.stderr) == (0, b"")
    assert [row["label"] for row in csv.DictReader(io.StringIO(done.stdout.decode()))] == [
        "green",
        "infra, red",
    ]


def test_a_reader_that_leaves_early_is_no_failure(tmp_path: Path) -> None:
    source = tmp_path / "in.ndjson"
    source.write_bytes(ndjson(GOOD) * 5000)
    done = subprocess.run(
        ["sh", "-c", f"'{COMMAND}' evaluate '{source}' --quiet | head -c 100"],
        env=environment(),
        capture_output=True,
        timeout=PATIENCE_S,
        check=False,
    )
    assert done.stdout.startswith(b'{"index":0')
    assert done.stderr == b""


def test_the_rule_set_of_lasers_that_name_none(tmp_path: Path) -> None:
    source, out = tmp_path / "in.ndjson", tmp_path / "out.ndjson"
    unnamed = {name: value for name, value in GOOD.items() if name != "rules"}
    source.write_bytes(ndjson(unnamed, GOOD))
    assert run(source, "-o", out, "--rules", "eu-2006-25") == 0
    first, second, _ = [json.loads(line) for line in out.read_bytes().splitlines()]
    assert (first["rules"], second["rules"]) == ("eu-2006-25", "icnirp-2013")


@pytest.mark.parametrize(
    ("content", "words"),
    [
        ("wavelength_nm,power_mw\n532,1\n", ("unknown column 'power_mw'", "power_w")),
        ("mode,mode\ncw,cw\n", ("twice",)),
        ("wavelength_nm\n\udc80\n", ("UTF-8",)),
        ("", ("column names",)),
        ("\n532,cw\n", ("column names",)),
    ],
)
def test_a_file_that_cannot_be_used(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], content: str, words: tuple[str, ...]
) -> None:
    source = tmp_path / "in.csv"
    source.write_bytes(content.encode(errors="surrogateescape"))
    assert run(source) == 2
    said = capsys.readouterr().err
    assert all(word in said for word in words), said


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("none.csv",), "none.csv: No such file"),
        (("in.csv", "--rules", "eu"), "eu-2006-25"),
        (("in.csv", "--to", "csv", "--detail", "full"), "whole answers do not fit"),
        (("in.csv", "--resume"), "--output"),
        (("in.csv", "-o", "in.csv", "--resume"), "same file"),
        (("in.csv", "-o", "none/out.csv"), "No such file"),
    ],
)
def test_options_that_cannot_be_used(
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
    arguments: tuple[str, ...],
    words: str,
) -> None:
    monkeypatch.chdir(tmp_path)
    Path("in.csv").write_text(CSV, encoding="utf-8")
    assert run(*arguments) == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    assert words in captured.err
    assert Path("in.csv").read_text(encoding="utf-8") == CSV


def test_numbers_of_csv_are_read_as_written(tmp_path: Path) -> None:
    """A comma within a number is never guessed; white space and a byte order mark do no harm."""
    source, out = tmp_path / "in.csv", tmp_path / "out.csv"
    head = "wavelength_nm;mode;power_w;diameter_mm;divergence_mrad\n"
    body = " 1064 ;cw;1e-3;2;1\n1,064;cw;1;2;1\n0x428;cw;1;2;1\nnan;cw;1;2;1\n1_064;cw;1;2;1\n1064;cw;1;2\n"
    source.write_text("\ufeff" + head + body, encoding="utf-8")
    assert run(source, "-o", out) == 1
    first, *rest = rows(out)
    assert (first["problem"], first["class_iec_60825_1_2014"]) == ("", "1")
    assert all(row["problem"].startswith("lines.0.wavelength_nm") for row in rest[:-1])
    assert rest[-1]["problem"].startswith("row: the row has 4 cells, the header 5")


def test_a_line_without_end_is_a_problem_in_its_place(tmp_path: Path) -> None:
    source, out = tmp_path / "in.ndjson", tmp_path / "out.ndjson"
    source.write_bytes(ndjson(GOOD) + b"[" * 2_500_000 + b"\n" + ndjson(GOOD).rstrip())
    assert run(source, "-o", out) == 1
    records = [json.loads(line) for line in out.read_bytes().splitlines()]
    assert ["problem" in record for record in records] == [False, True, False, False]
    assert records[1]["problem"]["type"] == "/problems/body-too-large"
