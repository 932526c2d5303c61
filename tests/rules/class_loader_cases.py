"""One wrong thing per case in the tables of a class scheme: what the loader must refuse."""

from __future__ import annotations

from tests.rules.class_engine import IEC, US
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

L, F, M = f"{IEC}/limits.csv", f"{IEC}/factors.csv", f"{IEC}/measurement.csv"
R, B, T = f"{IEC}/repetition.csv", f"{IEC}/timebases.csv", f"{IEC}/scheme.toml"
U = f"{US}/scheme.toml"
ROW = "3B-vis-1ns-60ms"
FIRST_ROWS = {L: ROW, F: "C4-nir", M: "3-302-400", R: "1-short-few", B: "3R-vis"}
NUMBERS = {L: "coefficient", F: "offset", M: "coefficient_mm", R: "count_power", B: "duration_s"}

EVERY_TABLE = [
    case
    for f, row in FIRST_ROWS.items()
    for case in (
        Case("unknown column", f, extra_column, "colour"),
        Case("renamed column", f, header("source", "sauce"), "sauce"),
        Case("missing column", f, without_column(NUMBERS[f]), NUMBERS[f]),
        Case("repeated column", f, repeated_column, "repeated"),
        Case("row cut short", f, short_row(row), "cells", row),
        Case("no rows", f, only_header, "empty"),
        Case("empty number", f, cell(row, NUMBERS[f], ""), NUMBERS[f], row),
        Case("text for a number", f, cell(row, NUMBERS[f], "many"), "many", row),
        Case("decimal comma", f, cell(row, NUMBERS[f], "1,5"), "1,5", row),
        Case("NaN", f, cell(row, NUMBERS[f], "nan"), "nan", row),
        Case("infinity", f, cell(row, NUMBERS[f], "inf"), "inf", row),
        Case("unknown source", f, cell(row, "source", "hearsay"), "hearsay", row),
        Case("empty locator", f, cell(row, "locator", ""), "locator", row),
        Case("unknown known", f, cell(row, "known", "guess"), "guess", row),
        Case("row twice", f, again(row), "twice", None, "last"),
    )
]

LIMITS = [
    Case("unknown quantity", L, cell(ROW, "quantity", "G"), "'G'", ROW),
    Case("unknown effect", L, cell(ROW, "effect", "warm"), "warm", ROW),
    Case("unknown class", L, cell(ROW, "target", "5"), "outside|time base|gap", None, "any"),
    Case("unknown break time", L, cell(ROW, "time_to_s", "T9"), "T9", ROW),
    Case("unknown factor", L, cell(ROW, "factors", "C_Z"), "C_Z", ROW),
    Case("factor beside its band", L, cell(ROW, "factors", "C2"), "C2", ROW),
    Case("empty band", L, cell(ROW, "wavelength_to_nm", "400"), "empty", ROW),
    Case("reversed time", L, cell(ROW, "time_to_s", "1e-11"), "empty", ROW),
    Case("gap in wavelength", L, cell(ROW, "wavelength_to_nm", "650"), "gap.*3B"),
    Case("gap in time", L, cell(ROW, "time_to_s", "0.05"), "gap.*3B"),
    Case("row missing", L, without(ROW), "gap.*3B"),
    Case("anterior row missing", L, without("1-anterior-1250-1400-subns"), "gap.*anterior"),
    Case("extended row missing", L, without("1-vis-10s-T2-extended"), "gap.*1"),
    Case("small-source row missing", L, without("3R-nir-10s-day-small"), "gap.*3R"),
    Case("row of Class 2 missing", L, without("2-vis-5us-250ms"), "gap.*2"),
    Case("overlap in wavelength", L, cell(ROW, "wavelength_to_nm", "1050"), "overlap", "3B-nir-1ns-break"),
    Case("overlap in time", L, cell(ROW, "time_to_s", "0.25"), "overlap", "3B-vis-60ms-day"),
    Case("same band twice", L, again(ROW, "again"), "overlap", None, "last"),
    Case("outside the coverage", L, cell("3R-uv-302-315-subns", "wavelength_from_nm", "180"), "outside",
         "3R-uv-302-315-subns"),
    Case("negative limit", L, cell(ROW, "coefficient", "-0.03"), "-0.03", ROW),
    Case("limit of zero", L, cell(ROW, "coefficient", "0"), "coefficient", ROW),
    Case("exponent that is no number", L, cell("1-vis-T2-day-extended", "factors", "C6 T2^x"), "T2",
         "1-vis-T2-day-extended"),
    Case("factor ends early", F, cell("C4-ir", "to", "1390"), "C4", "1-ir-1050-10s-day-small", L),
    Case("gap in a factor", F, cell("C4-nir", "to", "1040"), "C4", "C4-ir"),
    Case("break time missing", F, without("T_3B-nir"), "T_3B", "3B-nir-1ns-break", L),
    Case("repetition row missing", R, without("1-long-mid-many"), "repetition"),
]  # fmt: skip

TOML = [
    Case("unknown key", T, text('title = "', 'colour = "red"\ntitle = "'), "colour"),
    Case("unknown table", T, text("[repetition]", '[colour]\nred = "1"\n\n[repetition]'), "colour"),
    Case("title missing", T, text('title = "IEC 60825-1:2014, clauses 4 and 5"\n', ""), "title"),
    Case("id of another scheme", T, text('id = "iec-60825-1-2014"', 'id = "iec"'), "iec"),
    Case("unknown document", T, text('document = "iec-60825-1-2014"', 'document = "hearsay"'), "hearsay"),
    Case("remarks missing", T, text("remarks = [", "[extra]\nremarks = ["), "remarks|extra|roles"),
    Case("ceiling missing", T, text("[ceiling]\n", "[ceilings]\n"), "ceiling"),
    Case("unknown key of the ceiling", T, text('limits = "3B"', 'limits = "3B"\ncolour = "red"'), "colour"),
    Case("ceiling without limits", T, text('[ceiling]\nlimits = "3B"\n', "[ceiling]\n"), "ceiling"),
    Case("ceiling of no class", T, text('[ceiling]\nlimits = "3B"', '[ceiling]\nlimits = "3C"'), "no rows"),
    Case("unknown key of a class", T, text('name = "1"\n', 'name = "1"\ncolour = "red"\n'), "colour"),
    Case("class without a name", T, text('name = "1"\n', ""), "name"),
    Case("class naming missing limits", T, text('name = "1"\nlimits = "1"', 'name = "1"\nlimits = "0"'),
         "no rows"),
    Case("aided limits that are missing", T, text('aided_limits = "3B"', 'aided_limits = "3C"'), "no rows"),
    Case("fallback to missing limits", T, text('3R = "1"', '3R = "0"'), "no rows"),
    Case("fallback missing", T, text("[fallback]\n", "[fallbacks]\n"), "fallback"),
    Case("last class with limits", T, text('name = "4"', 'name = "4"\nlimits = "3B"'), "last class"),
    Case("class before the last without limits", T, text('name = "3B"\nlimits = "3B"', 'name = "3B"'),
         "last class"),
    Case("classes missing", T, everywhere("[[class]]", "[[kind]]"), "class"),
    Case("coverage missing", T, lambda p: p.write_text(p.read_text().split("[[coverage]]")[0]), "coverage"),
    Case("unknown key of a coverage", T, text('tissue = "anterior"', 'tisue = "anterior"'), "tisue"),
    Case("role missing", T, text('grouping = "T_i"\n', ""), "roles"),
    Case("no TOML", T, text("[roles]", "[roles"), "line"),
    Case("unknown key of the growth", U, text("until_s = 1e4", "until_s = 1e4\nhue = 1"), "hue"),
    Case("growth without its end", U, text("until_s = 1e4\n", ""), "until_s"),
    Case("ends of bands missing", U, text('band_ends = "upper"\n', ""), "band_ends"),
    Case("unknown end of bands", T, text('band_ends = "lower"', 'band_ends = "both"'), "both"),
]  # fmt: skip

CELLS = [
    Case("time base missing", B, without("2-vis"), "time base", None, "any"),
    Case("time base of another class", B, cell("2-vis", "target", "5"), "time base", None, "any"),
    Case("empty time base", B, cell("3R-vis", "duration_s", ""), "duration_s", "3R-vis"),
    Case("time base in words", B, cell("3R-vis", "duration_s", "T2"), "T2", "3R-vis"),
    Case("empty aperture", M, cell("3-400-1400", "coefficient_mm", " "), "coefficient_mm", "3-400-1400"),
    Case("distance in words", M, cell("3-400-1400", "distance_m", "near"), "near", "3-400-1400"),
    Case("empty condition", M, cell("3-400-1400", "condition", ""), "condition", "3-400-1400"),
    Case("unbounded time", M, cell("3-400-1400", "time_to_s", ""), "time_to_s", "3-400-1400"),
]

#: Each of these would change classes without a word, or stop the service with no word of the file.
SILENT = [
    Case("measurement row missing", M, without("3-400-1400"), "", None, "any"),
    Case("gap between measurement rows", M, cell("3-400-1400", "wavelength_to_nm", "1300"), "", None, "any"),
    Case("overlap of measurement rows", M, cell("3-302-400", "wavelength_to_nm", "500"), "", None, "any"),
    Case("gap in the time of a measurement", M, cell("3-1400-4000-short", "time_to_s", "0.3"), "", None,
         "any"),
    Case("unaided condition renamed", M, everywhere(",3,", ",4,"), "", None, "any"),
    Case("aperture of zero", M, cell("3-400-1400", "coefficient_mm", "0"), "", None, "any"),
    Case("negative distance", M, cell("3-400-1400", "distance_m", "-0.1"), "", None, "any"),
    Case("gap in the time bases", B, cell("1-vis-ir", "wavelength_from_nm", "500"), "", None, "any"),
    Case("time base of a band missing", B, without("3B-uv"), "", None, "any"),
    Case("overlap of time bases", B, cell("1-uv", "wavelength_to_nm", "500"), "", None, "any"),
    Case("time base of zero", B, cell("3R-vis", "duration_s", "0"), "", None, "any"),
    Case("time base beyond a day", B, cell("1-vis-ir", "duration_s", "1e6"), "", None, "any"),
    Case("band of a class reversed", T, text("= [302.5, 4000]", "= [4000, 302.5]"), "", None, "any"),
    Case("band of a class that is a number", T, text("= [302.5, 4000]", "= 302.5"), "", None, "any"),
    Case("band of a class without an end", T, text("= [302.5, 4000]", "= [302.5]"), "", None, "any"),
    Case("band of a coverage that is a number", T, text('"3B"\nwavelength_nm = [180, 1e+06]',
         '"3B"\nwavelength_nm = 180'), "", None, "any"),
    Case("growth band without its rate", U, text("per = 100.0\n", ""), "", None, "any"),
    Case("end of the growth in words", U, text("until_s = 1e4", 'until_s = "day"'), "", None, "any"),
    Case("growth band reversed", U, text("= [700, 800]", "= [800, 700]"), "", None, "any"),
    Case("repetition row that differs by class", R, cell("3R-long-mid-many", "coefficient", "0.5"), "",
         None, "any"),
    Case("fallback of an unknown class", T, text('3R = "1"', '3R = "1"\n5 = "1"'), "", None, "any"),
    Case("fallback that leads nowhere", T, text('3R = "1"', '3R = "2"'), "", None, "any"),
    Case("no fallback where one is needed", T, text('2 = "1"\n', ""), "", None, "any"),
    Case("two classes of one name", T, text('name = "1M"', 'name = "1"'), "", None, "any"),
    Case("ceiling of unknown source", U, text('source = "us-21cfr1040"\nlocator = "1040.10(b)',
         'source = "hearsay"\nlocator = "1040.10(b)'), "", None, "any"),
    Case("growth of unknown source", U, text('until_s = 1e4\nsource = "us-21cfr1040"',
         'until_s = 1e4\nsource = "hearsay"'), "", None, "any"),
    Case("unknown key of a growth band", U, text("per = 100.0", "per = 100.0\nhue = 1"), "", None, "any"),
    Case("time left out under optics", M, without("1-1400-4000-mid"), "", None, "any"),
    Case("fallback that is a number", T, text('2 = "1"', "2 = 1"), "not a text"),
    Case("fallback that is a list", T, text('2 = "1"', '2 = ["1"]'), "not a text"),
    Case("limits of a class that are a list", T, text('limits = "1"\naided', 'limits = ["1"]\naided'),
         "not a text"),
    Case("a remark that is a number", U, text("remarks = [", "remarks = [\n  1,"), "not a text"),
    Case("source of the ceiling that is a list", U, text('source = "us-21cfr1040"\nlocator = "1040.10(b)',
         'source = ["us-21cfr1040"]\nlocator = "1040.10(b)'), "not a text"),
    Case("unknown way of knowing the growth", U, text('locator = "1040.10(d) Table IV"\nknown = "memory"',
         'locator = "1040.10(d) Table IV"\nknown = "hearsay"'), "hearsay"),
    Case("growth bands that overlap", U, text("= [700, 800]", "= [700, 900]"), "overlap"),
    Case("growth of no rate", U, text("per = 100.0", "per = 0.0"), "positive"),
]  # fmt: skip

REFUSED = [*EVERY_TABLE, *LIMITS, *TOML, *CELLS, *SILENT]
