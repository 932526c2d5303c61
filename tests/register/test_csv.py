"""CSV in and out: all or nothing, hostile cells, and the way there and back."""

from __future__ import annotations

import csv
import io
import json
from typing import Any

import pytest

from service.web.register.csv_columns import guarded, unguarded
from tests.register.web import HTML, LASERS, Web, laser
from tests.web.shape import assert_problem

HEAD = "asset_tag,label,place,wavelength_nm,mode,power_w,diameter_mm,divergence_mrad"
ROW = "BL-{n},Laser {n},Room {n},532,cw,0.1,2,1"
CSV = {"content-type": "text/csv"}


def send(web: Web, data: str | bytes, query: str = "") -> Any:
    content = data if isinstance(data, bytes) else data.encode()
    return web.post(f"{LASERS}/import{query}", content=content, headers=CSV)


def table(*rows: str, head: str = HEAD) -> str:
    return "\r\n".join((head, *rows)) + "\r\n"


def exported(web: Web) -> list[dict[str, str]]:
    response = web.get(f"{LASERS}/export")
    assert response.headers["content-type"].startswith("text/csv")
    return list(csv.DictReader(io.StringIO(response.text, newline="")))


def test_rows_become_lasers(web: Web) -> None:
    done = web.ok(send(web, table(ROW.format(n=1), ROW.format(n=2))))
    assert done == {"checked_only": False, "created": 2, "changed": 0, "unchanged": 0}
    found = web.ok(web.get(f"{LASERS}?q=bl-1"))["items"][0]
    assert (found["label"], found["place"], found["status"]) == ("Laser 1", "Room 1", "draft")
    # The same laser through the API has the same figures.
    single = web.create(laser("X"))
    assert found["eye_hazard_distance_m"] == pytest.approx(99.7519, rel=1e-6)
    assert found["eye_hazard_distance_m"] == single["eye_hazard_distance_m"]
    assert found["optical_density"] == single["optical_density"]


def test_a_known_tag_changes_that_laser(web: Web) -> None:
    send(web, table(ROW.format(n=1), ROW.format(n=2)))
    changed = ROW.format(n=1).replace("0.1", "0.2")
    done = web.ok(send(web, table(changed, ROW.format(n=2), ROW.format(n=3))))
    assert done == {"checked_only": False, "created": 1, "changed": 1, "unchanged": 1}
    assert web.ok(web.get(f"{LASERS}?asset_tag=BL-1"))["items"][0]["revision"] == 2


def test_what_a_file_does_not_name_stays(web: Web) -> None:
    web.create(laser("BL-1", owner="A. Example", review_due="2027-01-31", place="Old"))
    web.ok(send(web, table(ROW.format(n=1).replace("0.1", "0.2"))))
    found = web.ok(web.get(f"{LASERS}/1"))
    assert (found["owner"], found["review_due"], found["revision"]) == ("A. Example", "2027-01-31", 2)
    assert found["place"] == "Room 1"


def test_checking_stores_nothing(web: Web) -> None:
    done = web.ok(send(web, table(ROW.format(n=1)), "?check_only=true"))
    assert done == {"checked_only": True, "created": 1, "changed": 0, "unchanged": 0}
    assert web.ok(web.get(LASERS))["total"] == 0
    assert web.ok(web.get("/api/v1/audit"))["items"] == []


def test_whole_results_are_kept_from_submission_on(web: Web) -> None:
    send(web, table(ROW.format(n=1)))
    found = web.ok(web.get(LASERS))["items"][0]
    assert web.ok(web.get(f"{LASERS}/1/revisions/1"))["result"] is None
    answer = web.ok(web.get(f"{LASERS}/1/evaluation"))
    assert answer["eye"]["hazard_distance_m"] == found["eye_hazard_distance_m"]
    web.ok(web.step(found, "submit"))
    assert web.ok(web.get(f"{LASERS}/1/revisions/1"))["result"] == answer


WRONG = {
    "number": (ROW.format(n=2).replace("532", "5x2"), "row 3, wavelength_nm"),
    "grouped": (ROW.format(n=2).replace("532", '"1,064"'), "row 3, wavelength_nm"),
    "range": (ROW.format(n=2).replace("532", "5"), "row 3, wavelength_nm"),
    "mode": (ROW.format(n=2).replace("cw", "continuous"), "row 3, mode"),
    "no mode": (ROW.format(n=2).replace("cw", ""), "row 3, mode"),
    "no power": (ROW.format(n=2).replace("0.1", ""), "row 3, power_w"),
    "cells": (ROW.format(n=2) + ",more", "row 3, row"),
    "same tag": (ROW.format(n=1), "row 3, asset_tag"),
    "no tag": (ROW.format(n=2).replace("BL-2", ""), "row 3, asset_tag"),
    "bell": (ROW.format(n=2).replace("Room", "Ro\x07om"), "row 3, place"),
    "long": (ROW.format(n=2).replace("Room", "R" * 300), "row 3, place"),
}


def test_one_wrong_row_and_nothing_is_stored(web: Web) -> None:
    for name, (row, field) in WRONG.items():
        document = assert_problem(send(web, table(ROW.format(n=1), row, ROW.format(n=4))), 422, field)
        assert "Nothing was imported" in document["detail"], name
        assert web.ok(web.get(LASERS))["total"] == 0, name


def test_every_error_is_listed(web: Web) -> None:
    rows = [ROW.format(n=n).replace("532", "x").replace("cw", "y") for n in range(30)]
    document = assert_problem(send(web, table(*rows)), 422, "row 2, wavelength_nm")
    assert [e["field"] for e in document["errors"]] == [f"row {n}, wavelength_nm" for n in range(2, 32)]


FILES = {
    "empty": b"",
    "header only": HEAD.encode(),
    "unknown column": table(ROW.format(n=1), head=HEAD.replace("place", "colour")).encode(),
    "column twice": table(ROW.format(n=1), head=HEAD.replace("place", "label")).encode(),
    "column missing": table("BL-1,532", head="asset_tag,wavelength_nm").encode(),
    "Latin-1": table(ROW.format(n=1).replace("Room", "Büro")).encode("latin-1"),
    "UTF-16": table(ROW.format(n=1)).encode("utf-16"),
    "NUL": table(ROW.format(n=1).replace("Room", "Ro\0om")).encode(),
    "1 MB cell": table(ROW.format(n=1).replace("Room", "x" * 1_000_000)).encode(),
    "open quotation": table('BL-1,"Laser 1,Room,532,cw,0.1,2,1').encode(),
    "binary": bytes(range(256)) * 20,
}


def test_files_that_cannot_be_read(web: Web) -> None:
    for name, data in FILES.items():
        response = send(web, data)
        assert response.status_code == 422, (name, response.text[:300])
        assert response.json()["errors"], name
        assert len(response.text) < 3000, name
    assert web.ok(web.get(LASERS))["total"] == 0
    assert_problem(web.post(f"{LASERS}/import", content=b"x", headers={"content-type": "text/plain"}), 415)


def test_a_file_above_the_limit_is_refused(address: str) -> None:
    web = Web(address, import_limit=500)
    assert_problem(send(web, table(*[ROW.format(n=n) for n in range(20)])), 413)
    web.close()


def test_what_spreadsheets_write_is_read(web: Web) -> None:
    semicolons = table(ROW.format(n=1).replace(",", ";").replace("0.1", "0,1"), head=HEAD.replace(",", ";"))
    assert web.ok(send(web, b"\xef\xbb\xbf" + semicolons.encode()))["created"] == 1
    assert web.ok(send(web, table(ROW.format(n=1)).replace("\r\n", "\n")))["unchanged"] == 1
    assert web.ok(send(web, table(ROW.format(n=1), "", ",,,,,,,", "")))["unchanged"] == 1


FORMULAS = ["=1+1", "+1", "-1", "@SUM(A1)", "'=x", "''=x", "'plain", "plain", "=cmd|' /C calc'!A0"]


def test_no_exported_cell_is_a_formula(web: Web) -> None:
    for n, text in enumerate(FORMULAS):
        web.create(laser(f"F-{n}", place=text, owner=text, label=f"{text} {n}"))
    rows = exported(web)
    for row, text in zip(rows, FORMULAS, strict=True):
        for column in ("asset_tag", "label", "place", "owner", "manufacturer"):
            assert not row[column].startswith(("=", "+", "-", "@", "\t", "\r")), row[column]
        assert unguarded(row["place"]) == text
    assert all(unguarded(guarded(t)) == t for t in FORMULAS)
    assert len({guarded(t) for t in FORMULAS}) == len(FORMULAS)


def test_an_exported_register_imports_back_the_same(web: Web, address: str, tmp_path: Any) -> None:
    bodies = [laser(f"F-{n}", place=text, label=f"{text} {n}") for n, text in enumerate(FORMULAS)]
    lines = [
        {"wavelength_nm": 1064, "emission": {"mode": "pulse", "energy_j": 0.05, "pulse_s": 8e-9}},
        {
            "wavelength_nm": 905.5,
            "emission": {"mode": "train", "average_power_w": 0.02, "pulse_s": 1e-7, "rate_hz": 5000},
        },
        {"wavelength_nm": 10600, "emission": {"mode": "cw", "power_w": 30}, "subtense_mrad": 7.25},
    ]
    beams = [
        {"diameter_mm": [1, 4], "divergence_mrad": [12, 3], "level": "1/e"},
        {"diameter_mm": 6, "divergence_mrad": 0.5, "waist_m": -1.5, "diameter_at": "exit"},
        {"diameter_mm": 5, "divergence_mrad": 2, "profile": "tophat"},
    ]
    for k, line in enumerate(lines):
        for m, beam in enumerate(beams):
            request = {"lines": [{**line, "beam": beam}], "rules": "eu-2006-25", "viewing": {"distance_m": m}}
            bodies.append({"asset_tag": f"L-{k}{m}", "label": "ä, \"ö\" & 'ü'", "request": request})
    several = [{**x, "beam": b} for x, b in zip(lines, beams, strict=True)]
    window = [{"name": "Screen", "distance_m": 2, "optical_density": 5}]
    request = {"lines": several, "windows": window, "exposure_s": 10}
    bodies.append({"asset_tag": "M", "request": request, "review_due": "2027-01-31"})
    for body in bodies:
        web.create(body)
    text = web.get(f"{LASERS}/export").content
    assert web.ok(send(web, text)) == {
        "checked_only": False,
        "created": 0,
        "changed": 0,
        "unchanged": len(bodies),
    }
    other = Web(f"sqlite:///{tmp_path}/other.sqlite3")
    assert other.ok(send(other, text))["created"] == len(bodies)
    keys = ("asset_tag", "label", "place", "owner", "manufacturer", "review_due", "request")
    for old in web.ok(web.get(f"{LASERS}?limit=500"))["items"]:
        new = other.ok(other.get(f"{LASERS}?asset_tag={old['asset_tag']}"))["items"][0]
        a = web.ok(web.get(f"{LASERS}/{old['id']}"))
        b = other.ok(other.get(f"{LASERS}/{new['id']}"))
        assert [a[k] for k in keys] == [b[k] for k in keys]
        assert a["current"]["figures"] == b["current"]["figures"]
    flat = [r["request_json"] == "" for r in exported(web)]
    assert flat.count(False) == 1
    other.close()


def test_ten_thousand_rows(web: Web) -> None:
    """A tenth of them on PostgreSQL; a second import finds nothing to do."""
    count = 10_000 if web.app.state.register.sqlite else 1_000
    rows = [f"T-{n},Laser {n},,{400 + n % 700},cw,{(1 + n % 50) * 0.001:.3f},2,1" for n in range(count)]
    assert web.ok(send(web, table(*rows)))["created"] == count
    assert web.ok(web.get(f"{LASERS}?limit=1"))["total"] == count
    assert web.ok(web.get(f"{LASERS}?asset_tag=T-999"))["items"][0]["wavelengths_nm"] == "699"
    assert web.ok(send(web, table(*rows[:500])))["unchanged"] == 500


def test_the_page_tells_the_columns_and_the_errors(web: Web) -> None:
    columns = {c["name"] for c in web.ok(web.get(f"{LASERS}/columns")) if c["imported"]}
    text = web.get("/lasers/import", headers=HTML).text
    assert all(f"<code>{c}</code>" in text for c in columns)
    file = {"file": ("a.csv", table(ROW.format(n=1).replace("532", "5x2")).encode(), "text/csv")}
    wrong = web.form("/lasers/import", {"step": "import"}, files=file)
    assert wrong.status_code == 422
    assert "row 2, wavelength_nm" in wrong.text
    file = {"file": ("a.csv", table(ROW.format(n=1)).encode(), "text/csv")}
    assert "would create 1" in web.form("/lasers/import", {"step": "check"}, files=file).text
    assert "created 1" in web.form("/lasers/import", {"step": "import"}, files=file).text


def test_the_request_in_a_cell(web: Web) -> None:
    request = json.dumps(laser()["request"])
    out = io.StringIO()
    writer = csv.writer(out)
    writer.writerow(["asset_tag", "label", "request_json"])
    writer.writerow(["J-1", "From JSON", request])
    assert web.ok(send(web, out.getvalue()))["created"] == 1
    for text in ("{", "[]", "3", '{"lines": []}'):
        bad = io.StringIO()
        csv.writer(bad).writerows([["asset_tag", "request_json"], ["J-2", text]])
        assert send(web, bad.getvalue()).status_code == 422
