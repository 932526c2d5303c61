"""The register under other tables: what would change is listed before anything is adopted."""

from __future__ import annotations

import dataclasses
import random
from typing import Any

import pytest

from service.contract.evaluation import EvaluationResult
from service.contract.request import EvaluationRequest
from service.register import figures, flow, lasers, reevaluate
from service.register.actor import Actor
from service.register.database import Database
from service.register.difference import differences
from service.register.figures import Kept, evaluated, kept
from service.register.models import LaserIn
from tests.register.web import LASERS, Web, laser
from tests.web.shape import assert_problem

LSO = Actor("lso", "admin", "command")
RUNS = "/api/v1/reevaluations"


def store_as_of_other_tables(database: Database, monkeypatch: pytest.MonkeyPatch) -> None:
    """Three lasers: one whose distance was 7 m under the tables of then, two that stay as they are."""
    with monkeypatch.context() as patched, database.write() as connection:
        patched.setattr(lasers, "tables_digest", lambda _: "sha256:then")
        patched.setattr(lasers, "tables_of", lambda _: {"rules/icnirp-2013": "sha256:then"})
        for tag in ("CHANGES", "STAYS", "RETIRED"):
            body = LaserIn.model_validate(laser(tag))
            found = kept(body.asked)
            if tag == "CHANGES":
                then = found.figures.model_copy(
                    update={"eye_hazard_distance_m": 7.0, "hazard_classes": {"iec-60825-1-2014": "1"}}
                )
                found = Kept(found.request, then, None)
            lasers.create(connection, LSO, body, found)
    with database.write() as connection:
        flow.retire(connection, LSO, 3, None)


def finished(web: Web) -> dict[str, Any]:
    """A pass that has ended, worked off in this thread."""
    database = web.app.state.register
    run_id = reevaluate.start(database, LSO, background=False)
    reevaluate.work(database, run_id)
    found: dict[str, Any] = web.ok(web.get(f"{RUNS}/{run_id}"))
    assert found["state"] == "done", found
    return found


def test_changes_are_listed_old_beside_new(web: Web, monkeypatch: pytest.MonkeyPatch) -> None:
    store_as_of_other_tables(web.app.state.register, monkeypatch)
    assert web.ok(web.get(f"{LASERS}?stale=true"))["total"] == 2
    run = finished(web)
    assert (run["total"], run["done"], run["changed"], run["adopted"]) == (2, 2, 1, 0)
    (change,) = web.ok(web.get(f"{RUNS}/{run['id']}/changes"))
    assert (change["asset_tag"], change["old"]["eye_hazard_distance_m"]) == ("CHANGES", 7.0)
    assert change["new"]["eye_hazard_distance_m"] == pytest.approx(99.7519, rel=1e-6)
    assert change["new"]["hazard_classes"]["iec-60825-1-2014"] == "3B"
    # Nothing is adopted by itself; whose figures hold is confirmed.
    assert web.ok(web.get(f"{LASERS}/1"))["eye_hazard_distance_m"] == 7.0
    assert [x["asset_tag"] for x in web.ok(web.get(f"{LASERS}?stale=true"))["items"]] == ["CHANGES"]


def test_adopting_makes_a_draft_to_be_approved(web: Web, monkeypatch: pytest.MonkeyPatch) -> None:
    store_as_of_other_tables(web.app.state.register, monkeypatch)
    run = finished(web)
    url = f"{RUNS}/{run['id']}/adopt"
    assert web.ok(web.post(url, {"laser_ids": []}))["adopted"] == []
    assert web.ok(web.post(url, {"laser_ids": None})) == {"adopted": [1], "left_out": []}
    found = web.ok(web.get(f"{LASERS}/1"))
    assert (found["revision"], found["status"]) == (2, "draft")
    assert found["eye_hazard_distance_m"] == pytest.approx(99.7519, rel=1e-6)
    assert found["current"]["reason"] == "re-evaluated under the tables in use"
    assert web.ok(web.get(f"{LASERS}/1/revisions/1"))["figures"]["eye_hazard_distance_m"] == 7.0
    assert web.ok(web.get(f"{LASERS}?stale=true"))["total"] == 0
    # A second time there is nothing left.
    assert web.ok(web.post(url, {}))["adopted"] == []
    web.ok(web.step(found, "submit"))


def test_what_changed_since_is_left_out(web: Web, monkeypatch: pytest.MonkeyPatch) -> None:
    store_as_of_other_tables(web.app.state.register, monkeypatch)
    run = finished(web)
    web.ok(web.post(f"{LASERS}/1/evaluate-anew", {}))
    told = web.ok(web.post(f"{RUNS}/{run['id']}/adopt", {}))
    assert told["adopted"] == []
    assert told["left_out"][0].startswith("CHANGES:")


def test_only_one_pass_at_a_time_and_none_of_other_tables(web: Web, monkeypatch: pytest.MonkeyPatch) -> None:
    web.create(laser())
    database = web.app.state.register
    waiting = reevaluate.start(database, LSO, background=False)
    assert_problem(web.post(RUNS, {}), 409)
    assert_problem(web.post(f"{RUNS}/{waiting}/adopt", {}), 409)
    monkeypatch.setattr(reevaluate, "SILENT_S", -1.0)
    run = finished(web)
    assert web.ok(web.get(f"{RUNS}/{waiting}"))["error"] == "interrupted"
    monkeypatch.setattr(reevaluate, "all_tables", lambda: "sha256:later")
    assert_problem(web.post(f"{RUNS}/{run['id']}/adopt", {}), 409)
    assert_problem(web.get(f"{RUNS}/99"), 404)


def test_a_draft_of_other_tables_is_evaluated_anew_before_it_is_submitted(
    web: Web, monkeypatch: pytest.MonkeyPatch
) -> None:
    store_as_of_other_tables(web.app.state.register, monkeypatch)
    found = web.ok(web.get(f"{LASERS}/1"))
    assert_problem(web.step(found, "submit"), 409)
    assert_problem(web.get(f"{LASERS}/1/evaluation"), 409)
    anew = web.ok(web.post(f"{LASERS}/1/evaluate-anew", {}))
    web.ok(web.step(anew, "submit"))


def requests() -> list[EvaluationRequest]:
    """Lasers of every kind, seeded."""
    rng = random.Random(7)
    found = []
    for n in range(30):
        lines = []
        for _ in range(rng.choice((1, 1, 2, 3))):
            emission: dict[str, Any] = {"mode": "cw", "power_w": 10 ** rng.uniform(-5, 2)}
            if n % 3:
                emission = {
                    "mode": "pulse",
                    "energy_j": 10 ** rng.uniform(-9, 0),
                    "pulse_s": 10 ** rng.uniform(-12, -1),
                }
            if n % 3 == 2:
                emission |= {"mode": "train", "rate_hz": 10 ** rng.uniform(0, 4)}
            beam = {
                "diameter_mm": [rng.uniform(0.5, 9), rng.uniform(0.5, 9)],
                "divergence_mrad": rng.uniform(0.1, 9),
            }
            lines.append({"wavelength_nm": 10 ** rng.uniform(2.3, 4.1), "emission": emission, "beam": beam})
        rules = rng.choice(("icnirp-2013", "eu-2006-25", "iec-60825-1-2014", "ansi-z136-1-2014"))
        more = {"viewing": {"distance_m": 2.0}} if n % 5 == 0 else {}
        found.append(EvaluationRequest.model_validate({"lines": lines, "rules": rules, **more}))
    return found


def test_figures_of_a_batch_are_those_of_the_single_answer() -> None:
    asked = requests()
    for one, request in zip(evaluated(asked), asked, strict=True):
        alone = kept(request)
        assert alone.result is not None
        result = EvaluationResult.model_validate_json(alone.result)
        assert dataclasses.replace(alone, result=None) == one
        assert one.figures.eye_hazard_distance_m == result.eye.hazard_distance_m
        assert one.figures.optical_density == result.eye.optical_density
        assert one.figures.hazard_classes == {c.scheme: c.hazard_class for c in result.classification}


def test_the_longer_distance_counts_where_an_aid_is_used(web: Web) -> None:
    """Binoculars gather more of a wide beam; the list shows the farther end of both."""
    body = laser("AIDED")
    body["request"]["viewing"] = {"aid": {"objective_mm": 50, "magnification": 7}}
    found = web.create(body)
    answer = web.ok(web.get(f"{LASERS}/1/evaluation"))
    ends = [answer[k]["hazard_distance_m"] for k in ("eye", "eye_aided")]
    assert ends[1] > ends[0]
    assert found["eye_hazard_distance_m"] == ends[1]
    assert found["current"]["figures"]["eye_hazard_distance_m"] == ends[0]
    assert found["current"]["figures"]["aided"]["hazard_distance_m"] == ends[1]
    assert found["optical_density"] == max(answer[k]["optical_density"] for k in ("eye", "eye_aided"))
    assert "Through the optical aid" in web.get("/lasers/1", headers={"accept": "text/html"}).text


def test_a_sweep_that_stops_counts(web: Web) -> None:
    """Eyewear and distances of a sweeping beam are those of the beam that stands still."""
    body = laser("SWEEP")
    body["request"]["bench"] = [{"element": "scanner", "angle_deg": 20, "sweeps_hz": 50}]
    found = web.create(body)
    answer = web.ok(web.get(f"{LASERS}/1/evaluation"))
    stopped = answer["scan"]["failure_eye"]
    assert stopped["hazard_distance_m"] > answer["eye"]["hazard_distance_m"]
    assert found["eye_hazard_distance_m"] == stopped["hazard_distance_m"]
    assert found["optical_density"] == stopped["optical_density"]
    assert found["skin_hazard_distance_m"] == max(
        answer["skin"]["hazard_distance_m"], answer["scan"]["failure_skin"]["hazard_distance_m"]
    )
    assert found["current"]["figures"]["eye_hazard_distance_m"] == answer["eye"]["hazard_distance_m"]
    assert "When the sweep stops" in web.get("/lasers/1", headers={"accept": "text/html"}).text


def test_a_sweep_that_stops_before_binoculars_counts(web: Web) -> None:
    body = laser("BOTH")
    body["request"]["bench"] = [{"element": "scanner", "angle_deg": 20, "sweeps_hz": 50}]
    body["request"]["viewing"] = {"aid": {"objective_mm": 50, "magnification": 7}}
    found = web.create(body)
    worst = web.ok(web.get(f"{LASERS}/1/evaluation"))["scan"]["failure_eye_aided"]
    assert found["eye_hazard_distance_m"] == worst["hazard_distance_m"]
    assert found["optical_density"] == worst["optical_density"]


def test_what_has_no_batch_path_is_answered_singly() -> None:
    body = laser("BENCH")["request"]
    body["bench"] = [{"element": "lens", "focal_mm": 50}, {"element": "window", "transmittance": 0.5}]
    request = EvaluationRequest.model_validate(body)
    alone = kept(request)
    assert evaluated([request]) == [dataclasses.replace(alone, result=None)]


def test_differences_name_every_field() -> None:
    old = {"a": 1, "lines": [{"w": 1, "d": [1, 2]}], "gone": {"x": 1}, "same": [1, 2]}
    new = {"a": 2, "lines": [{"w": 1, "d": [1, 3]}, {"w": 5}], "same": [1, 2], "more": True}
    found = [(c.field, c.old, c.new) for c in differences(old, new)]
    assert found == [
        ("a", 1, 2),
        ("lines.0.d", [1, 2], [1, 3]),
        ("gone.x", 1, None),
        ("lines.1.w", None, 5),
        ("more", None, True),
    ]


def test_the_order_of_classes() -> None:
    ranks = [figures.class_rank(c) for c in ("1", "1M", "2", "2M", "3R", "3B", "4")]
    assert ranks == sorted(ranks)
