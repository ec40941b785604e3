import dataclasses
import math
import runpy
from pathlib import Path

import numpy as np
import pytest

from tidescour.bed.filters import filter_ratios
from tidescour.bed.stone import OWN_SHIELDS, SCREENING_ONLY, STABILITY
from tidescour.bed.stone_records import FilterScreening, StoneScreening
from tidescour.handoff.columns_stone import FILTER_COLUMNS, STONE_COLUMNS, shields_column, size_column
from tidescour.handoff.stone_tables import STONE_LABEL, filter_table, stone_table
from tidescour.handoff.tables import csv_bytes, row_objects
from tidescour.plan.models_bed import Grading

INVENTED = runpy.run_path(str(Path(__file__).with_name("invented_stone.py")))
SIZES = (0.25, 0.5, np.nan, 0.125)


def screening(**changes):
    """Return a screening of one load."""
    return StoneScreening(sizes=(INVENTED["invented_size"](size_m=SIZES, **changes),), findings=())


def test_a_row_of_stone_has_its_load_and_all_forms_side_by_side():
    head, row = csv_bytes(stone_table(screening())).decode().splitlines()
    assert head == (
        "stage,opening,direction,location,time_utc,velocity_m_s,head_m,unit_discharge_m2_s,depth_m,turbulence_factor,"
        "stone_relative_density,shields_parameter_shields,shields_parameter_pilarczyk,stability_factor,slope_factor,"
        "stone_izbash_embedded_m,stone_izbash_exposed_m,stone_shields_m,stone_pilarczyk_m,assumption,status"
    )
    assert row == (
        '"sill, high",main gap,ebb,crest,2027-01-15T08:00:00Z,3,0.7,6,2,1.25,1.6,0.03,0.035,0.75,0.9,0.25,0.5,,0.125,'
        'invented,"screening only, not a design of the protection"'
    )


def recomputed(row):
    """Return the sizes of all forms from the numbers of a row alone; Shields' by halving steps."""
    velocity, depth, factor = row["velocity_m_s"], row["depth_m"], row["turbulence_factor"]
    density = row["stone_relative_density"]

    def shields_falls_short(size_m):
        chezy = 18.0 * math.log10(12.0 * depth / (2.0 * size_m))
        return size_m < (factor * velocity / chezy) ** 2 / (row["shields_parameter_shields"] * density)

    def pilarczyk_falls_short(size_m):
        profile = (1.0 + depth / size_m) ** -0.2
        mobility = row["stability_factor"] / density * (0.035 / row["shields_parameter_pilarczyk"])
        head_m = velocity**2 / (2.0 * 9.81)
        return size_m < mobility * profile * factor**2 / row["slope_factor"] * head_m

    return {
        "stone_izbash_embedded_m": velocity**2 / (1.2**2 * 2.0 * 9.81 * density),
        "stone_izbash_exposed_m": velocity**2 / (0.86**2 * 2.0 * 9.81 * density),
        "stone_shields_m": halved(shields_falls_short, 0.8 * depth),
        "stone_pilarczyk_m": halved(pilarczyk_falls_short, 10.0 * depth),
    }


def halved(falls_short, high):
    low = 0.0
    for _ in range(200):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if falls_short(middle) else (low, middle)
    return high


@pytest.mark.parametrize("shields", [None, 0.04])
def test_a_row_can_be_computed_again_from_its_own_numbers(shields):
    invented = INVENTED["invented_size"](size_m=SIZES, depth_m=6.0)
    demand = dataclasses.replace(invented.demand, shields=shields, depth_m=6.0)
    sizes = tuple(entry.function(demand) for entry in STABILITY.values())
    size = dataclasses.replace(invented, demand=demand, size_m=sizes)
    (row,) = row_objects(stone_table(StoneScreening(sizes=(size,), findings=())))
    for name, size_m in recomputed(row).items():
        assert row[name] == pytest.approx(size_m, rel=1e-9), name


def test_a_size_or_turbulence_that_is_not_known_is_null():
    (row,) = row_objects(stone_table(screening(turbulence_factor=np.nan)))
    assert row["turbulence_factor"] is None
    assert row["stone_shields_m"] is None


def test_a_row_of_a_filter_has_rule_ratio_and_limits():
    layers = [
        Grading(name="bed", d15_mm=0.15, d85_mm=0.35),
        Grading(name="layer", d10_mm=1.0, d15_mm=1.2, d60_mm=6.0, d85_mm=8.0),
    ]
    rows = row_objects(filter_table(filter_ratios(layers)))
    assert [(row["layer"], row["on"], row["holds"]) for row in rows] == [
        ("bed", "", "not known"),
        ("layer", "bed", "yes"),
        ("layer", "bed", "yes"),
        ("layer", "", "yes"),
    ]
    assert rows[0]["ratio"] is None
    assert (rows[2]["limit"], rows[2]["other_limit"], rows[2]["ratio"]) == (5.0, 4.0, pytest.approx(8.0))
    assert rows[2]["says"] == "d15F / d15B over 5 (4 is also in use)"
    assert {row["status"] for row in rows} == {SCREENING_ONLY}


def test_without_loads_and_filters_there_are_headings_alone():
    empty = stone_table(StoneScreening(sizes=(), findings=()))
    assert csv_bytes(empty).decode().splitlines() == [",".join(column.name for column in STONE_COLUMNS)]
    assert len(filter_table(FilterScreening(checks=(), findings=()))) == 0


def test_every_number_has_its_unit_in_its_name_or_is_said_to_be_bare():
    bare = {"turbulence_factor", "stability_factor", "slope_factor", "ratio", "limit", "other_limit"}
    bare |= {"stone_relative_density", "shields_parameter_shields", "shields_parameter_pilarczyk"}
    for column in (*STONE_COLUMNS, *FILTER_COLUMNS):
        assert column.kind != "number" or column.name in bare or column.name.endswith(("_m", "_m_s", "_m2_s"))


def test_the_label_says_what_it_is_for_and_what_else_must_be_looked_at():
    assert SCREENING_ONLY in STONE_LABEL
    for words in ("crest of the sill", "downstream slope", "edge", "not by that at the end", "sand-tightness", "0.84"):
        assert words in STONE_LABEL
    # A column a form, so that a new form gets its own.
    columns = {column.name for column in STONE_COLUMNS}
    assert {size_column(form) for form in STABILITY} <= columns
    assert {shields_column(form) for form in OWN_SHIELDS} <= columns
