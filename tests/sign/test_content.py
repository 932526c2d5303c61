"""What a sign says: class, sentence, signal word, figures; what is refused and what is left out."""

from __future__ import annotations

import math
import re
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.contract.answer import answer
from service.contract.evaluation import EvaluationResult
from service.contract.problem import InvalidRequest
from service.contract.request import EvaluationRequest
from service.sign.content import SignContent, SiteDefaults
from tests.sign.lasers import CLASSES, US_CLASSES, content, cw, line, result

TEMPORARY = {"kind": "temporary", "valid_from": "2026-12-01", "valid_to": "2026-12-05"}


def rows(found: SignContent) -> dict[str, list[str]]:
    """Lines of every row by its id, with plain blanks."""
    return {r.id: [text.replace("\u00a0", " ") for text in r.lines] for r in found.rows}


def evaluated(*lines: Any, **more: Any) -> EvaluationResult:
    return answer(EvaluationRequest.model_validate({"lines": list(lines), **more}))


def as_class(scheme: str, name: str) -> EvaluationResult:
    """A result whose class is replaced: classes that are hard to reach, such as IIa."""
    found = result("3R")
    classes = [
        c.model_copy(update={"hazard_class": name}) if c.scheme == scheme else c for c in found.classification
    ]
    return found.model_copy(update={"classification": classes})


@pytest.mark.parametrize("hazard_class", CLASSES)
def test_the_lasers_are_of_their_class(hazard_class: str) -> None:
    assert result(hazard_class).classification[0].hazard_class == hazard_class
    assert content(hazard_class).headlines[0].hazard_class == f"CLASS {hazard_class} LASER PRODUCT"


def test_class_sentences() -> None:
    """Sentences of IEC 60825-1 clause 7, from memory, in short."""
    said = {name: content(name).headlines[0].sentence for name in CLASSES}
    assert said["1"] is None
    assert said["2"] == "DO NOT STARE INTO THE BEAM"
    assert said["3R"] == "AVOID DIRECT EYE EXPOSURE"
    assert said["3B"] == "AVOID EXPOSURE TO THE BEAM"
    assert said["4"] == "AVOID EYE OR SKIN EXPOSURE TO DIRECT OR SCATTERED RADIATION"
    for name in ("1M", "2M"):
        assert "OPTICAL INSTRUMENTS" in str(said[name])


@pytest.mark.parametrize("name", US_CLASSES)
def test_classes_of_the_american_scheme(name: str) -> None:
    found = content(as_class("us-21cfr1040", name), scheme="us-21cfr1040")
    assert found.headlines[0].hazard_class == f"CLASS {name} LASER PRODUCT"
    assert (found.headlines[0].sentence is None) == (name == "I")


@pytest.mark.parametrize(
    ("wavelengths", "scheme", "said"),
    [
        ([532], "iec-60825-1-2014", "VISIBLE LASER RADIATION"),
        ([1064], "iec-60825-1-2014", "INVISIBLE LASER RADIATION"),
        ([355], "iec-60825-1-2014", "INVISIBLE LASER RADIATION"),
        ([1064, 532], "iec-60825-1-2014", "VISIBLE AND INVISIBLE LASER RADIATION"),
        # 400 to 700 nm in IEC 60825-1, 400 to 710 nm in 21 CFR 1040.10 (from memory).
        ([400], "iec-60825-1-2014", "VISIBLE LASER RADIATION"),
        ([700], "iec-60825-1-2014", "INVISIBLE LASER RADIATION"),
        ([705], "us-21cfr1040", "VISIBLE LASER RADIATION"),
    ],
)
def test_visible_or_not(wavelengths: list[float], scheme: str, said: str) -> None:
    found = evaluated(*(line(w, cw(0.05)) for w in wavelengths))
    assert content(found, scheme=scheme).headlines[0].radiation == said


@pytest.mark.parametrize(
    ("hazard_class", "policy", "word"),
    [
        ("1", "standard", "NOTICE"),
        ("2", "standard", "CAUTION"),
        ("3R", "strict", "CAUTION"),
        ("3B", "standard", "WARNING"),
        ("4", "standard", "WARNING"),
        ("3B", "strict", "DANGER"),
        ("4", "strict", "DANGER"),
    ],
)
def test_signal_word_by_class_and_policy(hazard_class: str, policy: str, word: str) -> None:
    found = content(hazard_class, SiteDefaults(policy=policy), family="ansi")
    assert found.signal_texts == [word]


def test_a_stronger_signal_word_may_be_asked_for_a_weaker_never() -> None:
    assert content("4", family="ansi", signal_word="danger").signal_word == "danger"
    for site, word in ((SiteDefaults(), "caution"), (SiteDefaults(policy="strict"), "warning")):
        with pytest.raises(InvalidRequest) as caught:
            content("4", site, family="ansi", signal_word=word)
        assert [e.field for e in caught.value.errors] == ["sign.signal_word"]


def test_a_temporary_area_is_a_notice_with_its_days() -> None:
    found = content("4", SiteDefaults(policy="strict"), family="ansi", **TEMPORARY)
    assert found.signal_texts == ["NOTICE"]
    assert found.banner == ["TEMPORARY LASER CONTROLLED AREA"]
    assert rows(found)["valid"] == ["2026-12-01 to 2026-12-05"]


@pytest.mark.parametrize(
    ("options", "fields"),
    [
        ({"kind": "temporary"}, ["sign.valid_from", "sign.valid_to"]),
        ({**TEMPORARY, "valid_to": "2026-11-30"}, ["sign.valid_to"]),
        ({"valid_from": "2026-12-01"}, ["sign.valid_from"]),
        ({"signal_word": "danger"}, ["sign.signal_word"]),
        ({"family": "ansi", "kind": "aperture", "signal_word": "danger"}, ["sign.signal_word"]),
        ({"languages": ["en", "en"]}, ["sign.languages"]),
        ({"scheme": "house-rules"}, ["sign.scheme"]),
    ],
)
def test_what_is_refused(options: dict[str, Any], fields: list[str]) -> None:
    with pytest.raises(InvalidRequest) as caught:
        content("3B", **options)
    assert [e.field for e in caught.value.errors] == fields
    assert all(e.remedy and e.allowed for e in caught.value.errors)


def test_what_is_missing_is_left_out_and_told() -> None:
    bare = evaluated(line(532, cw(0.1)))
    found = content(bare)
    assert {"laser", "room", "officer", "extra"} & set(rows(found)) == set()
    told = [entry.field for entry in found.left_out]
    assert told == ["evaluation.label", "sign.room", "sign.lso_name", "sign.address"]
    assert all(text.strip() for lines in rows(found).values() for text in lines)


def test_name_and_telephone_come_from_the_site_unless_given() -> None:
    site = SiteDefaults(lso_name="A. Example", lso_phone="123")
    assert rows(content("3B", site))["officer"] == ["A. Example · 123"]
    assert rows(content("3B", site, lso_name="B. Sample"))["officer"] == ["B. Sample · 123"]
    assert rows(content("3B", site, lso_phone=""))["officer"] == ["A. Example"]


def test_figures_are_those_of_the_answer() -> None:
    """532 nm, 0.1 W, 2 mm, 1 mrad: 99.8 m and OD 2.01 stand in the contract's published example.

    D LB5: 0.1 W on 1 mm of radius are 3.18e4 W/m2, times 2^1.7 for the size 1.03e5; LB4 ends at 1e5 (EN 207).
    """
    found = content("3B", room="Room 2.14", extra_lines=["Keep shut."])
    assert rows(found) == {
        "laser": ["Bench 4 alignment beam"],
        "output": ["532 nm: 100 mW, continuous"],
        "eyewear": ["532 nm: OD ≥ 2.1, D LB5"],
        "distance": ["eye: 99.8 m"],
        "room": ["Room 2.14"],
        "extra": ["Keep shut."],
    }


def test_a_pulse_train_tells_energy_duration_rate_and_average() -> None:
    """0.35 J x 10 Hz = 3.5 W; 1.7 W / 10 Hz = 170 mJ."""
    assert rows(content("4"))["output"] == [
        "1064 nm: 350 mJ, 8 ns, 10 Hz, average 3.5 W",
        "532 nm: 170 mJ, 8 ns, 10 Hz, average 1.7 W",
    ]
    pulse = evaluated(line(1064, {"mode": "pulse", "energy_j": 0.05, "pulse_s": 8.888e-9}, 6.0, 0.5))
    assert rows(content(pulse))["output"] == ["1064 nm: 50 mJ, 8.88 ns, single pulse"]


def test_lines_that_add_ask_for_more_density() -> None:
    """Two lines on the retina: each counts twice, so that their sum keeps the limit behind the filter."""
    found = result("4")
    shown = [re.search(r"OD ≥ ([\d.]+)", text) for text in rows(content("4"))["eyewear"]]
    densities = [float(s[1]) for s in shown if s]
    ratios = [need.worst_place.hazard_ratio for need in found.protection.lines]
    behind = sum(r * 10.0**-d for r, d in zip(ratios, densities, strict=True))
    assert behind <= 1.0
    own = [need.worst_place.optical_density for need in found.protection.lines]
    assert all(
        o + math.log10(2.0) <= d < o + math.log10(2.0) + 0.1 for o, d in zip(own, densities, strict=True)
    )


def test_without_an_end_it_is_the_whole_room() -> None:
    beam = evaluated(line(532, cw(0.1), 2.0, 0.0))
    assert beam.eye.hazard_distance_m is None
    assert rows(content(beam))["distance"] == ["eye: whole room"]
    assert rows(content("3B", whole_room=True))["distance"] == ["eye: whole room"]
    assert rows(content("3B", whole_room=True, languages=["de"]))["distance"] == ["Auge: ganzer Raum"]


def test_beyond_every_filter_nobody_is_told_to_wear_one() -> None:
    strong = evaluated(
        line(1064, {"mode": "train", "energy_j": 5e3, "pulse_s": 1e-8, "rate_hz": 100}, 1.0, 0.1)
    )
    found = content(strong)
    assert "no marked filter is strong enough" in rows(found)["eyewear"][0]
    assert "LB" not in rows(found)["eyewear"][0]
    assert "Wear" not in " ".join(found.notes[0].texts)


def test_what_exceeds_nothing_needs_no_eyewear() -> None:
    found = content("1")
    assert {"eyewear", "distance"} & set(rows(found)) == set()
    assert found.notes[0].texts == ["In doubt, see the laser safety officer"]
    assert not found.symbol


def test_labels_carry_class_output_standard_and_date() -> None:
    found = content("3B", kind="label")
    assert rows(found) == {"output": ["532 nm: 100 mW, continuous"]}
    assert found.footer == ["IEC 60825-1:2014 · 2026-12-01"]
    assert (found.notes, found.address, found.left_out) == ([], None, [])
    told = content("3B", kind="label", room="Room 2.14", whole_room=True).left_out
    assert [entry.field for entry in told] == ["sign.room", "sign.whole_room"]
    aperture = content("3B", kind="aperture")
    assert aperture.headlines[0].radiation == "LASER APERTURE"
    assert (aperture.rows, aperture.footer, aperture.symbol) == ([], [], False)


def test_two_languages_share_figures_and_agree_on_the_decimal_mark() -> None:
    both, one = content("4", languages=["de", "en"]), content("4", languages=["de", "fr"])
    assert "average / im Mittel" not in rows(both)["output"][0]
    assert rows(both)["output"][0] == "1064 nm: 350 mJ, 8 ns, 10 Hz, im Mittel / average 3.5 W"
    assert rows(one)["output"][0].endswith("3,5 W")
    assert content("4", languages=["en", "fr"], family="ansi", signal_word="danger").signal_texts == [
        "DANGER"
    ]


def test_the_day_is_given_or_today() -> None:
    assert content("2").date == "2026-12-01"
    assert content("2", date="2026-11-03").footer[0].startswith("Assessed 2026-11-03: ICNIRP")


@given(
    st.floats(1e-4, 1e3),
    st.floats(200, 1e5),
    st.floats(0.5, 20),
    st.floats(0.1, 10),
    st.sampled_from(["en", "de"]),
)
@settings(max_examples=30, deadline=None)
def test_no_printed_figure_is_smaller_than_the_answer(
    power: float, wavelength: float, diameter: float, spread: float, language: str
) -> None:
    found = evaluated(line(wavelength, cw(power), diameter, spread))
    for figure in content(found, languages=[language]).figures:
        text = figure.shown.replace(",", ".").split("\u00a0")
        prefix = text[1][: -len(figure.unit)] if len(text) > 1 else ""
        scale = {"k": 1e3, "": 1.0, "m": 1e-3, "µ": 1e-6}[prefix]
        if figure.unit == "nm":
            scale = 1e3 if text[1] == "µm" else 1.0
        assert float(text[0]) * scale >= figure.value * (1 - 1e-12), figure


def with_bench(*elements: Any, **viewing: Any) -> EvaluationResult:
    return evaluated(line(532, cw(0.1)), bench=list(elements), viewing=viewing)


def test_a_sweeping_beam_counts_as_if_it_stopped() -> None:
    found = with_bench({"element": "scanner", "angle_deg": 20.0, "sweeps_hz": 100.0})
    assert found.scan is not None
    swept, stopped = found.eye.hazard_distance_m, found.scan.failure_eye.hazard_distance_m
    assert swept is not None
    assert stopped is not None
    assert swept < stopped
    # The beam standing still is the published example: 99.8 m.
    assert rows(content(found))["distance"][0] == "eye: 99.8 m"
    (figure,) = (f for f in content(found).figures if f.path.startswith("scan.failure_eye"))
    assert figure.value == stopped


def test_an_optical_aid_is_told_and_asks_for_more_density() -> None:
    aid = {"objective_mm": 50.0, "magnification": 7.0, "transmittance": 1.0}
    found, bare = with_bench(aid=aid), with_bench()
    assert found.eye_aided is not None
    shown = rows(content(found))
    assert [text.partition(":")[0] for text in shown["distance"]] == ["eye", "eye with optical aid"]
    far = found.eye_aided.hazard_distance_m
    assert far is not None
    assert far > 99.8
    density = float(shown["eyewear"][0].partition("≥ ")[2].partition(",")[0])
    assert found.eye_aided.hazard_ratio * 10.0**-density <= 1.0
    assert density >= 2.1
    assert rows(content(bare))["distance"] == ["eye: 99.8 m"]


def test_a_sweep_seen_through_an_aid_counts_as_if_it_stopped() -> None:
    """5 W, 532 nm, 1 mrad: 0.25 s allow 18 t^0.75 / t x the 7 mm pupil = 0.97966 mW behind an aid that
    gathers 49 mm (7 x 7, below its 50): 1/e2 width 0.049 sqrt(-2 / ln(1 - P/5)) = 4.950 m, 4950.37 m away.
    """
    aid = {"objective_mm": 50.0, "magnification": 7.0, "transmittance": 1.0}
    scanner = {"element": "scanner", "angle_deg": 30.0, "sweeps_hz": 100.0}
    found = evaluated(line(532, cw(5.0)), bench=[scanner], viewing={"aid": aid})
    shown = rows(content(found))
    assert shown["distance"][-1] == "eye with optical aid: 4.96 km"
    # 5 W through the pupil (7 mm, 1/e2 width 2 mm: all but e^-24.5), 49 times as much for the aided eye.
    (need,) = found.protection.lines
    assert need.behind_aid is not None
    asked = math.log10(5.0 / 0.97965568786e-3)
    assert need.worst_place.optical_density == pytest.approx(asked, abs=1e-6)
    density = float(shown["eyewear"][0].partition("≥ ")[2].partition(",")[0])
    assert need.behind_aid.optical_density <= density < need.behind_aid.optical_density + 0.1
    assert content(found) != content(evaluated(line(532, cw(5.0)), bench=[scanner]))
    still = evaluated(line(532, cw(5.0)), viewing={"aid": aid})
    assert {k: shown[k] for k in ("distance", "eyewear")} == {
        k: rows(content(still))[k] for k in ("distance", "eyewear")
    }


def test_behind_a_diffuser_figures_hold_for_scattered_light_and_say_so() -> None:
    strong = line(532, cw(20.0))
    found = evaluated(strong, bench=[{"element": "diffuser", "reflectance": 0.9}])
    labels = {r.id: r.label for r in content(found, languages=["en", "de"]).rows}
    wanted = "Hazard distance (scattered light only) / Sicherheitsabstand (nur Streulicht)"
    assert labels["distance"] == wanted
    assert "(scattered light only)" in labels["eyewear"]
    # The class stays that of the laser.
    assert content(found).hazard_class == "4"


def test_in_an_open_resonator_the_circulating_beam_is_the_output() -> None:
    """0.1 W through a mirror that passes 2 % circulate as 5 W."""
    open_line = {**line(532, cw(0.1)), "output_mirror_reflectance": 0.98}
    assert rows(content(evaluated(open_line)))["output"] == ["532 nm: 5 W, continuous"]
