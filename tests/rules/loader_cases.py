"""One wrong thing per case: what the loader must refuse, and what it still lets through."""

from __future__ import annotations

from tests.rules.edits import (
    Case,
    again,
    cell,
    everywhere,
    extra_column,
    header,
    only_header,
    repeated_column,
    short_row,
    text,
    without,
    without_column,
)
from tests.rules.engine import EU, ICNIRP

L, F, A = f"{ICNIRP}/limits.csv", f"{ICNIRP}/factors.csv", f"{ICNIRP}/apertures.csv"
D, R, ADD = f"{ICNIRP}/durations.csv", f"{ICNIRP}/repetition.csv", "additivity.csv"
T = f"{ICNIRP}/ruleset.toml"
SKIN, UV = "skin-vis-1ns-100ns", "180-315-with-180-315"
FIRST_ROWS = {
    L: SKIN,
    F: "C_A-nir",
    A: "eye-uv-mid",
    D: "glance",
    R: "short-few",
    ADD: "180-315-with-180-315",
}
NUMBERS = {
    L: "coefficient", F: "offset", A: "coefficient_mm", D: "duration_s", R: "count_power", ADD: "band_to_nm",
}  # fmt: skip

EVERY_TABLE = [
    case
    for f, row in FIRST_ROWS.items()
    for case in (
        Case("unknown column", f, extra_column, "colour"),
        Case("renamed column", f, header("source", "sauce"), "sauce"),
        Case("missing column", f, without_column(NUMBERS[f]), NUMBERS[f]),
        Case("missing note column", f, without_column("note"), "note"),
        Case("repeated column", f, repeated_column, "repeated"),
        Case("row cut short", f, short_row(row), "cells", row),
        Case("no rows", f, only_header, "empty"),
        Case("empty number", f, cell(row, NUMBERS[f], ""), NUMBERS[f], row),
        Case("blank number", f, cell(row, NUMBERS[f], "  "), NUMBERS[f], row),
        Case("text for a number", f, cell(row, NUMBERS[f], "many"), "many", row),
        Case("decimal comma", f, cell(row, NUMBERS[f], "1,5"), "1,5", row),
        Case("an expression", f, cell(row, NUMBERS[f], "2*3"), r"2\*3", row),
        Case("NaN", f, cell(row, NUMBERS[f], "nan"), "nan", row),
        Case("infinity", f, cell(row, NUMBERS[f], "inf"), "inf", row),
        Case("minus infinity", f, cell(row, NUMBERS[f], "-Infinity"), "Infinity", row),
        Case("overflow", f, cell(row, NUMBERS[f], "1e999"), "1e999", row),
        Case("empty source", f, cell(row, "source", ""), "source", row),
        Case("unknown source", f, cell(row, "source", "hearsay"), "hearsay", row),
        Case("empty locator", f, cell(row, "locator", ""), "locator", row),
        Case("empty name", f, cell(row, "row", ""), "row"),
        Case("unknown known", f, cell(row, "known", "guess"), "guess", row),
        Case("empty known", f, cell(row, "known", ""), "known", row),
        Case("row twice", f, again(row), "twice", None, "last"),
    )
]

LIMITS = [
    Case("unknown quantity", L, cell(SKIN, "quantity", "G"), "'G'", SKIN),
    Case("unknown effect", L, cell(SKIN, "effect", "warm"), "warm", SKIN),
    Case("unknown target", L, cell(SKIN, "target", "hand"), "hand", SKIN),
    Case("target of all", L, cell(SKIN, "target", "*"), r"\*", SKIN),
    Case("NaN for a time", L, cell(SKIN, "time_to_s", "nan"), "nan", SKIN),
    Case("unknown break time", L, cell(SKIN, "time_to_s", "T9"), "T9", SKIN),
    Case("infinite cap", L, cell(SKIN, "cap", "inf"), "inf", SKIN),
    Case("unknown factor", L, cell(SKIN, "factors", "C_Z"), "C_Z", SKIN),
    Case("factor of another set", L, cell(SKIN, "factors", "C4"), "C4", SKIN),
    Case("factor beside its band", L, cell(SKIN, "factors", "C_B"), "C_B", SKIN),
    Case("factor below its band", L, cell("eye-uv-304", "factors", "C_A"), "C_A", "eye-uv-304"),
    Case("odd subtense", L, cell("eye-vis-10s-day-small", "subtense_to_mrad", "2"), "subtense",
         "eye-vis-10s-day-small"),
    Case("empty band", L, cell(SKIN, "wavelength_to_nm", "400"), "empty", SKIN),
    Case("reversed time", L, cell(SKIN, "time_to_s", "1e-11"), "empty", SKIN),
    Case("gap in wavelength", L, cell(SKIN, "wavelength_to_nm", "650"), "gap.*skin"),
    Case("gap in time", L, cell(SKIN, "time_to_s", "5e-8"), "gap.*skin"),
    Case("row missing", L, without(SKIN), "gap.*skin"),
    Case("second limit missing", L, without("eye-anterior-1250-1400-subns"), "gap.*anterior"),
    Case("blue light missing", L, without("eye-blue-100s-day"), "gap.*retina"),
    Case("extended row missing", L, without("eye-vis-10s-T2-extended"), "gap.*retina"),
    Case("small-source row missing", L, without("eye-nir-10s-day-small"), "gap.*retina"),
    Case("tissue misspelt", L, cell("eye-vis-5us-10s", "tissue", "retinna"), "gap.*retina"),
    Case("overlap in wavelength", L, cell(SKIN, "wavelength_to_nm", "710"), "overlap|gap"),
    Case("overlap in time", L, cell(SKIN, "time_to_s", "2e-7"), "overlap", "skin-vis-100ns-10s"),
    Case("same band twice", L, again(SKIN, "again"), "overlap", None, "last"),
    Case("overlap below", L, cell(SKIN, "wavelength_from_nm", "390"), "overlap"),
]  # fmt: skip

OTHERS = [
    Case("gap in a factor", F, cell("C_A-nir", "to", "1040"), "C_A", "C_A-ir"),
    Case("overlap in a factor", F, cell("C_A-nir", "to", "1060"), "C_A", "C_A-ir"),
    Case("open end inside a factor", F, cell("C_A-nir", "to", ""), "C_A", "C_A-ir"),
    Case("new variable inside a factor", F, cell("C_A-ir", "variable", "time_s"), "C_A", "C_A-ir"),
    Case("unknown variable", F, cell("C_A-ir", "variable", "colour"), "colour", "C_A-ir"),
    Case("empty piece", F, cell("alpha_min", "to", "1e-13"), "empty", "alpha_min"),
    Case("factor ends early", F, cell("C_A-ir", "to", "1390"), "C_A", "eye-nir-10s-day-small", L),
    Case("factor starts late", F, without("C_B-400"), "C_B", "eye-blue-10s-100s", L),
    Case("factor missing", F, without("alpha_min"), "alpha_min"),
    Case("T2 ends early", F, cell("T2-large", "to", "120"), "T2", "eye-vis-10s-T2-extended", L),
    Case("aperture gap in time", A, cell("eye-ir-short", "time_to_s", "0.3"), "gap"),
    Case("aperture overlap in time", A, cell("eye-ir-short", "time_to_s", "0.4"), "gap|overlap"),
    Case("aperture ends early", A, cell("eye-ir-long", "time_to_s", "1000"), "gap"),
    Case("aperture starts late", A, without("eye-uv-short"), "gap"),
    Case("aperture gap in wavelength", A, cell("eye-far", "wavelength_from_nm", "2e5"), "no aperture"),
    Case("aperture missing", A, without("skin"), "no aperture"),
    Case("aperture of a tissue missing", A, without("eye-retina"), "no aperture"),
    Case("aperture twice", A, again("eye-retina", "again"), "gap|overlap"),
    Case("aperture of another target", A, cell("skin", "target", "hand"), "hand", "skin"),
    Case("unknown kind", D, cell("glance", "kind", "usual"), "usual", "glance"),
    Case("empty words", D, cell("glance", "words", ""), "words", "glance"),
    Case("unknown pulse", R, cell("short-few", "pulse", "tiny"), "tiny", "short-few"),
    Case("unknown bound", R, cell("long-mid-few", "subtense_to_mrad", "gamma"), "gamma", "long-mid-few"),
    Case("neither yes nor no", ADD, cell(UV, "eye", "maybe"), "maybe", UV),
    Case("a limit in no band", ADD, everywhere(",180,315", ",180,310"), "additivity", "eye-uv-303-315-subns",
         L),
    Case("a pair of bands missing", ADD, without("180-315-with-400-1400"), "pair"),
    Case("additivity not closed", ADD, cell("315-400-with-400-1400", "eye", "yes"), "closed"),
]  # fmt: skip

TOML = [
    Case("unknown key", T, text('family = "2013"', 'family = "2013"\ncolour = "red"'), "colour"),
    Case("unknown table", T, text("[repetition]", '[colour]\nred = "1"\n\n[repetition]'), "colour"),
    Case("missing key", T, text('family = "2013"\n', ""), "family"),
    Case("wrong type", T, text('family = "2013"', "family = 2013"), "family"),
    Case("id of another set", T, text('id = "icnirp-2013"', 'id = "icnirp"'), "icnirp"),
    Case("unknown document", T, text('document = "icnirp-2013"', 'document = "hearsay"'), "hearsay"),
    Case("unknown role", T, text('grouping = "T_i"', 'grouping = "T_i"\ncolour = "red"'), "colour"),
    Case("role missing", T, text('grouping = "T_i"\n', ""), "roles"),
    Case("role without factor", T, text('grouping = "T_i"', 'grouping = "T_x"'), "T_x", None, F),
    Case("unknown key of a step", T, text('beyond = "al', 'colour = "red"\nbeyond = "al'), "colour"),
    Case("missing key of a step", T, text('below = "1"\n', ""), "below"),
    Case("step of unknown source", T, text('source = "icnirp-2013"', 'source = "hearsay"'), "hearsay"),
    Case("step of unknown known", T, text('known = "memory"', 'known = "guess"'), "guess"),
    Case("count within a day", T, text('count_within = "T2"', 'count_within = "day"'), "count_within"),
    Case("coverage missing", T, lambda p: p.write_text(p.read_text().split("[[coverage]]")[0]), "coverage"),
    Case("row outside the coverage", T, text("time_s = [1e-13, 3e4]", "time_s = [1e-13, 10]"), "outside",
         "skin-uv-180-303", L),
    Case("no TOML", T, text("[roles]", "[roles"), "line"),
    Case("unknown key of a source", "sources.toml", text("year = 2013", 'year = 2013\nhue = "red"'), "hue"),
    Case("missing key of a source", "sources.toml", text("year = 2013\n", ""), "icnirp-2013"),
]  # fmt: skip

# Each of these would change limits, or weaken their proof, without a word.
SILENT = [
    Case("unknown key of a coverage", T, text('tissue = "lens"', 'tisue = "lens"'), "tisue"),
    Case("unknown key of repetition", T, text('symbol = "C_P"', 'symbol = "C_P"\ncolour = "red"'), "colour"),
    Case("unknown boundaries", f"{EU}/ruleset.toml", text("time_s = [1e-11", "times = [1e-11"), "times"),
    Case("digits with a low line", L, cell(SKIN, "coefficient", "2_00"), "2_00", SKIN),
    Case("field angle not tabled", F, cell("gamma-short", "from", "50"), "gamma"),
    Case("alpha_max not tabled", F, cell("alpha_max-short", "from", "1e-9"), "alpha_max"),
    Case("row outside its own coverage", L, cell("eye-blue-10s-100s", "time_from_s", "1"), "outside"),
    Case("repetition row missing", R, without("long-mid-many"), "repetition"),
    Case("default duration missing", D, without("default-vis"), "default"),
    Case("coverage beyond every row", T, text("nm = [180, 1e6]", "nm = [100, 1e6]"), "gap"),
    Case("negative limit", L, cell(SKIN, "coefficient", "-200"), "-200", SKIN),
    Case("limit of zero", L, cell(SKIN, "coefficient", "0"), "coefficient", SKIN),
    Case("quantity of a class", L, cell(SKIN, "quantity", "P"), "'P'", SKIN),
    Case("exponent that is no number", L, cell(SKIN, "factors", "T2^x"), "T2", SKIN),
    Case("repetition symbol missing", T, text('symbol = "C_P"\n', ""), "symbol"),
    Case("coverage without a target", T, text('target = "skin"\n', ""), "target"),
]  # fmt: skip

REFUSED = [*EVERY_TABLE, *LIMITS, *OTHERS, *TOML, *SILENT]
