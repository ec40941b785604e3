import tomllib
import unicodedata

import jsonschema
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from tidescour.plan.rules_inputs import series_have_own_names
from tidescour.plan.schema import plan_schema
from tidescour.plan.sections import draft_of

NAMES = {
    "site.name": "Invented gap",
    "site.datum": "site datum",
    "stage[1": "sill to -6",
    "opening[2": "shoal",
    "series.": "jet",
}
NEEDS = 'needs one line of printable text: not blank, no blanks at its ends, no "=" or "@" in front'
UNPRINTABLE = (
    *(f"a{sign}b" for sign in "\0\t\n\r\x1b\x7f\x85\u2028\u2029"),
    *(f"a{chr(number)}b" for number in (*range(0x202A, 0x202F), *range(0x2066, 0x206A))),
)
FAIR = ("-6 m", "+6 m", "a", "a = b @ c", "Sl\u00fbis \u2013 n\u00f8rd", "\u6c34\u9053", "x" * 80)


def toml_text(text):
    return '"' + "".join(f"\\U{ord(sign):08x}" for sign in text) + '"'


def renamed(plan_text, old, new):
    for quoted in (f'"{old}"', f"series.{old}]"):
        series = quoted.startswith("series")
        plan_text = plan_text.replace(quoted, f"series.{toml_text(new)}]" if series else toml_text(new))
    return plan_text


@pytest.mark.parametrize("key", NAMES)
@pytest.mark.parametrize(
    "name", ["", " ", "gap ", " gap", "gap\u00a0", "=A1", "@A1", "x" * 81, *UNPRINTABLE], ids=ascii
)
def test_a_name_that_is_no_plain_line_is_refused(problems, plan_text, key, name):
    (found,) = problems(text=renamed(plan_text, NAMES[key], name))
    assert key in found
    assert NEEDS in found or (len(name) > 80 and "one line of printable text" in found and "80 characters" in found)
    assert found.isprintable()
    assert len(found) < 400


@pytest.mark.parametrize("key", NAMES)
@pytest.mark.parametrize("name", FAIR, ids=ascii)
def test_a_fair_name_passes(read, plan_text, key, name):
    assert read(renamed(plan_text, NAMES[key], name))


@pytest.mark.parametrize("evidence", ["", " ", "x" * 501, *UNPRINTABLE], ids=ascii)
def test_evidence_is_one_line(problems, plan_text, evidence):
    (found,) = problems(text=renamed(plan_text, "levelled again", evidence))
    assert "correction[1].evidence: found" in found
    assert "needs one line of printable text" in found
    assert found.isprintable()


def test_evidence_may_be_long(read, plan_text):
    evidence = "levelled twice; " * 31
    assert read(renamed(plan_text, "levelled again", evidence)).correction[0].evidence == evidence


def test_a_name_in_a_workbook_cell_of_two_lines_is_refused_by_its_row(problems, plan_text, tmp_path):
    (tmp_path / "p.csv").write_text(
        "stage,start,end,opening,crest_level_m,width_m,relation,coefficient\n"
        'one,2027-01-01T00:00:00Z,2027-02-01T00:00:00Z,"sho\nal",-6,400,broad-crest,0.9\n'
    )
    text = plan_text[: plan_text.index("[[stage]]")].replace('opening."shoal"', 'opening."sho\\nal"')
    (found,) = problems(text=text + '[programme]\nfile = "p.csv"\n')
    assert found.startswith(
        'p.csv row 2, opening: stage[1 "one"].opening[1 "sho\\nal"].name: found "sho\\nal"; ' + NEEDS
    )


@pytest.mark.parametrize("key", NAMES)
def test_the_schema_knows_what_a_name_is(choices, plan_text, key):
    validator = jsonschema.Draft202012Validator(plan_schema(choices))

    def passes(name):
        return validator.is_valid(as_json(tomllib.loads(renamed(plan_text, NAMES[key], name))))

    assert all(passes(name) for name in FAIR)
    assert not any(passes(name) for name in ("", "gap ", " gap", "=A1", "@A1", "x" * 81, *UNPRINTABLE))


def as_json(value):
    """Return TOML as tools hand it to a schema: date-times as strings."""
    if isinstance(value, dict):
        return {key: as_json(item) for key, item in value.items()}
    if isinstance(value, list):
        return [as_json(item) for item in value]
    return value if isinstance(value, str | int | float) else value.isoformat()


def is_fair(name):
    """Tell by the Unicode tables, and by no pattern, whether a name is one."""
    turns = {*range(0x202A, 0x202F), *range(0x2066, 0x206A)}
    plain = not any(unicodedata.category(sign) in ("Cc", "Zl", "Zp") or ord(sign) in turns for sign in name)
    return plain and name.strip() == name and 1 <= len(name) <= 80 and name[0] not in "=@"


SIGNS = st.one_of(
    st.characters(exclude_categories=["Cs"]), st.sampled_from(" =@-\t\n\u00a0\u0085\u2028\u202e\u2069\u200b")
)


@settings(max_examples=200, deadline=None)
@given(name=st.text(SIGNS, max_size=4))
def test_names_of_tables_and_of_series_follow_the_same_rule(name, plan_text, choices):
    assume(name not in ("tide", "measured", "routed"))  # words that a series may not be called
    written = tomllib.loads(plan_text)
    written["site"]["name"] = name
    written["series"][name] = written["series"].pop("jet")
    draft, problems = draft_of(written, choices)
    wrong = [problem.path for problem in (*problems, *series_have_own_names(draft))]
    assert wrong == ([] if is_fair(name) else [("site", "name"), ("series", name)])
