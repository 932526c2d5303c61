"""Lines are copied, elements moved, durations chosen in words, two of three values give the third."""

from __future__ import annotations

import json
from typing import Any
from urllib.parse import parse_qsl, urlsplit

import pytest

from tests.web.client import Client
from tests.web.pages import CW, address, page
from tests.web.shape import assert_problem
from tests.web.test_addresses import ONE, target


def values(url: str) -> dict[str, str]:
    return dict(parse_qsl(urlsplit(url).query))


def body(client: Client, fields: dict[str, str]) -> dict[str, Any]:
    shown: dict[str, Any] = json.loads(page(client, address(fields)).one("pre").text)
    return shown


def test_a_copied_line_holds_the_same_values_and_units(client: Client) -> None:
    start = ONE.replace("power_w-1=0.1", "power_w-1=100&power_w-1.in=mW")
    url = target(client, start + "&change=copy-line-1")
    assert url.endswith("#line-2")
    kept = values(url)
    for name in ("wavelength_nm", "mode", "power_w", "diameter_mm", "divergence_mrad"):
        assert kept[f"{name}-2"] == kept[f"{name}-1"]
    assert (kept["power_w-2.in"], kept["lines"]) == ("mW", "2")


def test_the_line_in_the_middle_is_removed(client: Client) -> None:
    fields = {"lines": "3", **{f"wavelength_nm-{k}": w for k, w in ((1, "808"), (2, "1064"), (3, "532"))}}
    kept = values(target(client, address(fields, change="remove-line-2")))
    assert (kept["lines"], kept["wavelength_nm-1"], kept["wavelength_nm-2"]) == ("2", "808", "532")
    assert "wavelength_nm-3" not in kept


BENCH = {
    "elements": "3",
    "bench_kind-1": "lens", "bench_focal_mm-1": "200",
    "bench_kind-2": "space", "bench_length_m-2": "50", "bench_length_m-2.in": "cm",
    "bench_kind-3": "reflector", "bench_reflectance-3": "4", "bench_reflectance-3.in": "pc",
}  # fmt: skip


def test_the_bench_of_the_form_is_the_bench_of_the_request(client: Client) -> None:
    shown = body(client, {**CW, **BENCH})["bench"]
    given = [
        {"element": "lens", "focal_mm": 200.0},
        {"element": "space", "length_m": 0.5},
        {"element": "reflector", "reflectance": 0.04},
    ]
    assert [{k: v for k, v in e.items() if k in g} for e, g in zip(shown, given, strict=True)] == given
    root = page(client, address({**CW, **BENCH}))
    items = [li.text for li in root.one("ol").all("li")]
    assert items[0].startswith("Lens, focal length 200 mm")
    assert items[1] == "Free space, length 0.5 m"
    assert items[2].startswith("Flat reflector, reflectance 0.04")


def test_elements_are_added_moved_and_removed(client: Client) -> None:
    url = target(client, address({**CW, **BENCH}, change="up-element-3"))
    assert url.endswith("#element-2")
    kept = values(url)
    assert [kept[f"bench_kind-{k}"] for k in (1, 2, 3)] == ["lens", "reflector", "space"]
    assert (kept["bench_reflectance-2"], kept["bench_length_m-3.in"]) == ("4", "cm")
    kept = values(target(client, address({**CW, **BENCH}, change="down-element-1")))
    assert [kept[f"bench_kind-{k}"] for k in (1, 2, 3)] == ["space", "lens", "reflector"]
    kept = values(target(client, address({**CW, **BENCH}, change="remove-element-2")))
    assert [kept[f"bench_kind-{k}"] for k in (1, 2)] == ["lens", "reflector"]
    kept = values(target(client, address({**CW, **BENCH}, change="add-element-window")))
    assert (kept["elements"], kept["bench_kind-4"]) == ("4", "window")


CHANGES = ("add-prism", "add-element-prism", "add-element", "copy-line", "copy-line-2", "up-element-1",
           "remove-line-x", "add-line-1", "remove")  # fmt: skip


@pytest.mark.parametrize("change", CHANGES)
def test_unknown_changes_are_refused(client: Client, change: str) -> None:
    assert_problem(client.get(f"{ONE}&change={change}"), 400, "change")


#: Fields and the one that is named.
MISTAKES = {
    "lens without a focal length": ({"elements": "1", "bench_kind-1": "lens"}, "bench_focal_mm-1"),
    "no kind": ({"elements": "1"}, "bench_kind-1"),
    "reflectance above one": (
        {"elements": "1", "bench_kind-1": "mirror", "bench_radius_mm-1": "100", "bench_reflectance-1": "120",
         "bench_reflectance-1.in": "pc"}, "bench_reflectance-1",
    ),
    "nothing known of a reflector": (
        {"elements": "1", "bench_kind-1": "reflector"}, "bench_reflectance-1",
    ),
    "second element": (
        {"elements": "2", "bench_kind-1": "space", "bench_length_m-1": "1", "bench_kind-2": "space",
         "bench_length_m-2": "long"}, "bench_length_m-2",
    ),
    "optics without an objective": ({"aid_magnification": "7"}, "aid_objective_mm"),
    "haze too thick": ({"visibility_km": "0"}, "visibility_km"),
}  # fmt: skip


@pytest.mark.parametrize(("more", "name"), MISTAKES.values(), ids=MISTAKES.keys())
def test_mistakes_on_the_bench_are_told_at_their_field(
    client: Client, more: dict[str, str], name: str
) -> None:
    root = page(client, address({**CW, **more}), 422)
    links = [a.attributes["href"] for a in root.one("section", role="alert").all("a")]
    assert f"#{name}" in links
    assert all(link[1:] in root.ids for link in links)


def test_an_element_has_the_fields_of_its_kind(client: Client) -> None:
    one = {"elements": "1", "bench_kind-1": "space", "bench_length_m-1": "1", "bench_focal_mm-1": "5"}
    assert_problem(client.get(address({**CW, **one})), 400, "bench_focal_mm-1")


FIBRE = {
    "lines": "1", "wavelength_nm-1": "976", "mode-1": "cw", "power_w-1": "8", "profile-1": "fibre_multimode",
    "numerical_aperture-1": "0.22", "core_diameter_um-1": "105",
}  # fmt: skip


def test_a_fibre_end_is_entered_by_its_data_sheet(client: Client) -> None:
    beam = body(client, FIBRE)["lines"][0]["beam"]
    assert beam == {"profile": "fibre_multimode", "numerical_aperture": 0.22, "core_diameter_um": 105.0}
    single = {k: v for k, v in FIBRE.items() if k[:3] not in ("num", "cor")}
    single |= {"profile-1": "fibre_single_mode", "mode_field_diameter_um-1": "6.6"}
    assert body(client, single)["lines"][0]["beam"]["mode_field_diameter_um"] == 6.6


def test_a_free_beam_beside_a_fibre_is_refused(client: Client) -> None:
    root = page(client, address({**FIBRE, "diameter_mm-1": "2"}), 422)
    assert [a.attributes["href"] for a in root.one("section", role="alert").all("a")] == ["#diameter_mm-1"]


def test_optics_add_a_column_and_a_sentence(client: Client) -> None:
    """7 x 50 binoculars: the aided eye has figures of its own, those of the JSON answer."""
    fields = {**CW, "aid_magnification": "7", "aid_objective_mm": "50"}
    root = page(client, address(fields))
    request = {
        "exposure_s": 0.25, "viewing": {"aid": {"magnification": 7, "objective_mm": 50}},
        "lines": [{"wavelength_nm": 532, "emission": {"mode": "cw", "power_w": 0.1},
                   "beam": {"diameter_mm": 2, "divergence_mrad": 1}}],
    }  # fmt: skip
    answer = client.evaluate(request)
    shown = root.by_id("hazard-distance").all("data")
    assert [float(d.attributes["value"]) for d in shown][-1] == answer["eye_aided"]["hazard_distance_m"]
    assert "Looking into the beam through the optics entered is unsafe" in root.text
    assert "criteria-eye-with-optics" in root.ids


#: Energy, average power and rate: P = E x f. The third by hand.
TRAIN = {
    "lines": "1", "wavelength_nm-1": "1064", "mode-1": "train", "pulse_s-1": "1e-8", "diameter_mm-1": "2",
    "divergence_mrad-1": "1",
}  # fmt: skip
TWO = {
    "energy and rate": ({"energy_j-1": "0.002", "rate_hz-1": "500"}, 500.0, "Average power", "1 W"),
    "power and rate": (
        {"average_power_w-1": "1", "rate_hz-1": "500"}, 500.0, "Energy of one pulse", "0.002 J",
    ),
    "energy and power": (
        {"energy_j-1": "0.002", "average_power_w-1": "1"}, 500.0, "Repetition rate", "500 Hz",
    ),
}  # fmt: skip


@pytest.mark.parametrize(("two", "rate", "label", "value"), TWO.values(), ids=TWO.keys())
def test_two_of_three_give_the_third(
    client: Client, two: dict[str, str], rate: float, label: str, value: str
) -> None:
    root = page(client, address({**TRAIN, **two}))
    emission = json.loads(root.one("pre").text)["lines"][0]["emission"]
    assert emission["rate_hz"] == pytest.approx(rate, rel=1e-15)
    energy = emission.get("energy_j") or emission["average_power_w"] / emission["rate_hz"]
    assert energy == pytest.approx(0.002, rel=1e-15)
    told = root.by_id("third-1").text
    assert told == f"{label}, from the other two: {value}"


def test_three_of_three_are_refused_and_compared(client: Client) -> None:
    three = {"energy_j-1": "0.002", "rate_hz-1": "500", "average_power_w-1": "3"}
    root = page(client, address({**TRAIN, **three}), 422)
    assert [a.attributes["href"] for a in root.one("section", role="alert").all("a")] == [
        "#average_power_w-1"
    ]
    assert "give 1" in root.by_id("average_power_w-1-error").text


def test_one_of_three_is_not_enough(client: Client) -> None:
    root = page(client, address({**TRAIN, "energy_j-1": "0.002"}), 422)
    links = [a.attributes["href"] for a in root.one("section", role="alert").all("a")]
    assert links == ["#rate_hz-1"]


def test_a_duration_in_words_is_its_number(client: Client) -> None:
    start = ONE.replace("&exposure_s=0.25", "")
    assert target(client, start + "&look=2") == start.replace("&lines", "&exposure_s=2&lines")
    assert target(client, start + "&look=usual&exposure_s=") == start
    assert target(client, start + "&look=other&exposure_s=7") == start.replace(
        "&lines", "&exposure_s=7&lines"
    )
    root = page(client, start + "&look=2")
    assert "for a deliberate look while aligning (German practice), 2 s" in root.text
    (checked,) = (r for r in root.all("input", type="radio", name="look") if "checked" in r.attributes)
    assert checked.attributes["value"] == "2"
    assert root.by_id("exposure_s").attributes["value"] == ""


def test_words_and_a_number_that_disagree_are_refused(client: Client) -> None:
    for look in ("usual", "2"):
        root = page(client, address({**CW, "exposure_s": "10", "look": look}), 422)
        assert "typed another" in root.by_id("exposure_s-error").text
        assert root.by_id("exposure_s").attributes["value"] == "10"
    root = page(client, address({**{k: v for k, v in CW.items() if k != "exposure_s"}, "look": "other"}), 422)
    assert "exposure_s-error" in root.ids


def test_who_asks_and_where_stand_on_the_sheet_and_change_no_figure(client: Client) -> None:
    root = page(client, address({**CW, "place": "Room 12", "asked_by": "A. Nobody"}))
    given = root.by_id("setup-given").text
    assert "Where it stands: Room 12" in given
    assert "Who asks: A. Nobody" in given
    assert json.loads(root.one("pre").text) == body(client, CW)


SCANNER = {
    "elements": "1", "bench_kind-1": "scanner", "bench_angle_deg-1": "30", "bench_sweeps_hz-1": "100",
    "outdoors": "1",
}  # fmt: skip


def test_a_sweep_outdoors(client: Client) -> None:
    """The sweep, the beam standing still and the zones of the airspace, as the JSON answer has them."""
    shown = body(client, {**CW, **SCANNER})
    assert shown["viewing"] == {"outdoors": True}
    answer = client.evaluate(shown)
    root = page(client, address({**CW, **SCANNER}))
    values = [
        d.attributes["value"] for d in root.one("section", aria_labelledby="airspace-title").all("data")
    ]
    for zone in answer["airspace"]["zones"]:
        assert repr(zone["level_w_m2"]) in values
    sweep = root.one("section", aria_labelledby="sweep-title").text
    assert "stopped" in sweep
    stopped = answer["scan"]["failure_eye"]["hazard_distance_m"]
    assert repr(stopped) in [d.attributes["value"] for d in root.all("data")]
    assert "Looking into the beam when the sweep stops is unsafe out to" in root.text


def test_a_raster_has_whole_rows(client: Client) -> None:
    raster = {**SCANNER, "bench_rows-1": "20", "bench_height_deg-1": "5"}
    assert body(client, {**CW, **raster})["bench"][0]["rows"] == 20
    for wrong in ("2.5", "0", "1,000"):
        root = page(client, address({**CW, **raster, "bench_rows-1": wrong}), 422)
        links = [a.attributes["href"] for a in root.one("section", role="alert").all("a")]
        assert links == ["#bench_rows-1"]


def test_a_lit_spot_is_looked_at(client: Client) -> None:
    spot = {
        "elements": "1",
        "bench_kind-1": "diffuser",
        "bench_reflectance-1": "80",
        "bench_reflectance-1.in": "pc",
    }
    root = page(client, address({**CW, **spot}))
    assert "Looking at the lit spot" in root.text
    answer = client.evaluate(json.loads(root.one("pre").text))
    assert answer["inputs"]["bench"][0]["reflectance"] == 0.8
    ratio = repr(answer["diffuse"]["day_hazard_ratio"])
    assert ratio in [
        d.attributes["value"] for d in root.one("section", aria_labelledby="spot-title").all("data")
    ]


def test_nothing_stands_behind_a_diffuser(client: Client) -> None:
    behind = {
        "elements": "2", "bench_kind-1": "diffuser", "bench_kind-2": "window", "bench_transmittance-2": "0.5",
    }  # fmt: skip
    root = page(client, address({**CW, **behind}), 422)
    alert = root.one("section", role="alert")
    assert [a.attributes["href"] for a in alert.all("a")] == ["#elements"]
    assert "last element" in alert.text
