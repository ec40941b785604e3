import openpyxl
import pytest

LISTS = "level_m = [-3.0, 0.0, 3.0]\narea_m2 = [1.4e7, 2.0e7, 2.6e7]\n"
TABLE = 'table = "hypsometry.csv"\n'
COLUMN = 'table_column = "volume_m3"\n'


@pytest.fixture
def full_problems(problems, full_text, full_tables):
    def problems_of(*changes: tuple[str, str], purpose: str = "run") -> tuple[str, ...]:
        return problems(*changes, text=full_text, purpose=purpose)

    return problems_of


def test_lists_of_areas_leave_the_volumes_empty(read, plan_text):
    basin = read(plan_text).basin
    assert (basin.level_m, basin.area_m2) == ((-3.0, 0.0, 3.0), (1.4e7, 2.0e7, 2.6e7))
    assert basin.volume_m3 == ()


def test_volumes_stand_instead_of_areas(read, plan_text, edit):
    basin = read(edit(plan_text, ("area_m2 = [1.4e7, 2.0e7, 2.6e7]", "volume_m3 = [-1.0, 5.1e7, 1.2e8]"))).basin
    assert (basin.area_m2, basin.volume_m3) == ((), (-1.0, 5.1e7, 1.2e8))


def test_a_table_fills_the_lists(read, full_text, full_tables, edit):
    basin = read(full_text).basin
    assert (basin.level_m, basin.area_m2, basin.volume_m3) == ((-3.0, 0.0, 3.0), (), (0.0, 5.1e7, 1.2e8))
    assert (basin.length_m, basin.depth_m) == (8000.0, 4.5)
    areas = read(edit(full_text, (COLUMN, ""))).basin
    assert (areas.level_m, areas.area_m2, areas.volume_m3) == ((-3.0, 0.0, 3.0), (1.4e7, 2.0e7, 2.6e7), ())


def test_a_table_without_areas_gives_volumes(read, full_text, full_tables, edit):
    full_tables("hypsometry.csv", ("area_m2", "wet"))
    assert read(edit(full_text, (COLUMN, ""))).basin.volume_m3 == (0.0, 5.1e7, 1.2e8)


def test_a_workbook_gives_the_same_storage(read, full_text, full_tables, edit, tmp_path):
    book = openpyxl.Workbook()
    for row in (("level_m", "volume_m3"), (-3, 0.0), (0, 5.1e7), (3, 1.2e8)):
        book.active.append(row)
    book.save(tmp_path / "hypsometry.xlsx")
    assert read(edit(full_text, ("hypsometry.csv", "hypsometry.xlsx"))).basin.volume_m3 == (0.0, 5.1e7, 1.2e8)


def test_inflows_hold_what_is_written(read, full_text, full_tables):
    river, pumps = read(full_text).basin.inflow
    assert (river.name, river.discharge_m3_s, river.series) == ("river", 12.0, None)
    assert (pumps.name, pumps.discharge_m3_s, pumps.series) == ("pumps", None, "model")


@pytest.mark.parametrize(
    ("new", "message"),
    [
        ("level_m = [-3.0, 0.0, 3.0]\n", "basin.area_m2: missing, or volume_m3, or a table: Wet area at each level"),
        ("area_m2 = [1.4e7, 2.0e7, 2.6e7]\n", "basin.level_m: missing, or a table: Levels, increasing"),
        ("volume_m3 = [1.4e7, 2.0e7, 2.6e7]\n", "basin.level_m: missing, or a table: Levels, increasing"),
        (LISTS + "volume_m3 = [0, 1, 2]\n", "basin.volume_m3: stands beside area_m2; leave out one of the two"),
        (LISTS + 'table_column = "area_m2"\n', "basin.table_column: belongs to basin.table, and none is given"),
        ("level_m = [0.0, 1.0]\nvolume_m3 = [5, 5]\n", "basin.volume_m3[2]: found 5 after 5; the volume must increase"),
        ("level_m = [0.0, 1.0]\nvolume_m3 = [0, 1, 2]\n", "basin.volume_m3: has 3 values where level_m has 2"),
        ("level_m = [0.0]\nvolume_m3 = [1]\n", "basin.volume_m3: found [1]; needs at least 2 in the list"),
        ("level_m = []\narea_m2 = [1]\n", "basin.level_m: found []; needs at least 1 in the list"),
        (
            "level_m = [0.0, 1.5]\narea_m2 = [1, 0]\n",
            ": at level 1.5 m write the smallest area that stays wet, or start the table higher",
        ),
        (LISTS + "length_m = 0\n", "basin.length_m: found 0; needs a number over 0"),
        (LISTS + "depth_m = -1\n", "basin.depth_m: found -1; needs a number over 0"),
        (LISTS + "lenght_m = 9\n", 'basin.lenght_m: unknown key; did you mean "length_m"?'),
    ],
)
def test_storage_comes_from_one_source(problems, new, message):
    (found,) = problems((LISTS, new))
    assert message in found


def test_a_basin_without_any_storage_misses_both_lists(problems):
    found = problems((LISTS, "inflow_m3_s = 3\n"))
    assert [problem.split(": ")[1] for problem in found] == ["basin.level_m", "basin.area_m2"]


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ((TABLE, TABLE + "level_m = [0.0, 1.0]\n"), "basin.level_m: stands beside table; leave out one of the two"),
        ((TABLE, TABLE + "area_m2 = [1, 2]\n"), "basin.area_m2: stands beside table; leave out one of the two"),
        ((COLUMN, 'table_column = "volume"\n'), 'basin.table_column: found "volume"; did you mean "volume_m3"?'),
        ((TABLE, "table = 3\n"), "basin.table: found 3; needs text in quotes"),
        ((TABLE, 'table = "hypsometry.txt"\n'), 'basin.table: "hypsometry.txt": no such file in '),
    ],
)
def test_a_table_stands_alone(full_problems, change, message):
    (found,) = full_problems(change)
    assert message in found


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        (
            (("volume_m3", "volume"),),
            'basin.table: hypsometry.csv: has no column "volume_m3"; it has "level_m", "area_',
        ),
        ((("level_m", "z"),), 'basin.table: hypsometry.csv: has no column "level_m"; it has "z", "area_m2" and "volum'),
        ((("5.1e7", "much"),), 'basin.table: hypsometry.csv row 3: volume_m3: found "much"; needs a finite number'),
        ((("5.1e7", ""),), "basin.table: hypsometry.csv row 3: volume_m3: is empty; needs a finite number"),
        (
            (("\n3,", "\n-1,"),),
            "hypsometry.csv row 4, level_m: basin.level_m[3]: found -1 after 0; levels must increase",
        ),
        ((("5.1e7", "-1"),), "hypsometry.csv row 3, volume_m3: basin.volume_m3[2]: found -1 after 0; the volume must"),
    ],
)
def test_a_faulty_table_is_named_by_its_row(full_problems, full_tables, changes, message):
    full_tables("hypsometry.csv", *changes)
    (found,) = full_problems()
    assert message in found


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (
            ("1.4e7", "0"),
            "csv row 2, area_m2: basin.area_m2[1]: found 0.0; needs a number over 0: at level -3.0 m write",
        ),
        (
            ("2.6e7", "1.9e7"),
            "hypsometry.csv row 4, area_m2: basin.area_m2[3]: found 1.9e+07 after 2e+07; the wet area",
        ),
        (
            ("area_m2,volume_m3", "area,volume"),
            'has no column "area_m2" or "volume_m3"; it has "level_m", "area" and "volume"',
        ),
    ],
)
def test_areas_of_a_table_are_judged_as_lists(full_problems, full_tables, change, message):
    full_tables("hypsometry.csv", change)
    (found,) = full_problems((COLUMN, ""))
    assert message in found


def test_a_table_that_is_not_there_yet_stops_no_reading_of_records(read, full_text, full_tables, tmp_path):
    (tmp_path / "hypsometry.csv").unlink()
    assert read(full_text, "records").basin is None


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("discharge_m3_s = 12\n", "", 'inflow[1 "river"].discharge_m3_s: missing; give it, or a series of discharge'),
        ("discharge_m3_s = 12\n", 'discharge_m3_s = 12\nseries = "model"\n', ".series: stands beside discharge_m3_s"),
        ("discharge_m3_s = 12\n", "discharge_m3_s = inf\n", ".discharge_m3_s: found inf; needs a finite number"),
        ('name = "pumps"', 'name = "river"', 'inflow[2 "river"].name: stands twice; every inflow needs a name of its'),
        ('name = "pumps"\n', "", "basin.inflow[2].name: missing: Name."),
        (
            'name = "pumps"\nseries = "model"',
            'name = "pumps"\nseries = "modle"',
            'no [series.modle]; did you mean "model"',
        ),
        (
            'name = "pumps"\nseries = "model"',
            'name = "pumps"\nseries = "storm"',
            "a series of level; needs one of disch",
        ),
        (
            'name = "pumps"\nseries',
            'name = "pumps"\nserie',
            'basin.inflow[2 "pumps"].serie: unknown key; did you mean "series"',
        ),
    ],
)
def test_a_faulty_inflow_is_refused(full_problems, old, new, message):
    found = full_problems((old, new))
    assert [problem for problem in found if message in problem], found


def test_reading_records_minds_no_basin_without_storage(read, problems, plan_text, edit):
    change = ("area_m2 = [1.4e7, 2.0e7, 2.6e7]\n", "")
    assert read(edit(plan_text, change), "records").basin is None
    for purpose in ("run", "calibrate"):
        found = problems(change, purpose=purpose)
        assert [problem for problem in found if "basin.area_m2: missing, or volume_m3, or a table" in problem]
