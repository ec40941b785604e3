"""The methods of a run in the hand-off and as a table."""

import csv
import io
import json

import pytest

from tidescour.errors import Finding
from tidescour.handoff.encode import json_bytes
from tidescour.handoff.methods_table import left_range, method_objects, methods_table
from tidescour.handoff.tables import csv_bytes
from tidescour.table import Entry, symbols


def entry(name, *left_by):
    return Entry(
        name=name,
        title=f"Invented {name}",
        function=len,
        says="y = a x\nb where x < 0",
        symbols=symbols(("y", "m", "depth"), ("a", "-", "slope")),
        validity="x over 0",
        source="nobody",
        confidence="from memory",
        left_by=left_by,
    )


def finding(code, where="stage 'one'", severity="warning"):
    return Finding(severity=severity, code=code, where=where, message=f"{code}, found")


FINDINGS = (finding("steep"), finding("other"), finding("deep"), finding("steep", "stage 'two'", "note"))


def test_a_method_has_left_its_range_where_a_finding_of_its_codes_says_so():
    assert left_range(entry("line", "steep", "deep"), FINDINGS) == (
        "stage 'one': steep, found",
        "stage 'one': deep, found",
        "stage 'two': steep, found",
    )
    assert left_range(entry("line"), FINDINGS) == ()
    assert left_range(entry("line", "steep"), ()) == ()


def test_methods_are_objects_with_their_symbols_and_where_the_run_left_their_range():
    objects = method_objects([entry("line", "deep"), entry("curve")], FINDINGS)
    assert json.loads(json_bytes({"methods": objects}))["methods"] == objects
    assert [each["name"] for each in objects] == ["line", "curve"]
    assert objects[0] == {
        "name": "line",
        "title": "Invented line",
        "says": "y = a x\nb where x < 0",
        "symbols": [
            {"name": "y", "unit": "m", "meaning": "depth"},
            {"name": "a", "unit": "-", "meaning": "slope"},
        ],
        "range": "x over 0",
        "source": "nobody",
        "how_sure": "from memory",
        "left_range": ["stage 'one': deep, found"],
    }
    assert objects[1]["left_range"] == []


def test_the_table_of_methods_has_one_line_a_method():
    text = csv_bytes(methods_table([entry("line", "steep"), entry("curve")], FINDINGS)).decode("utf-8")
    rows = list(csv.DictReader(io.StringIO(text)))
    assert list(rows[0]) == ["name", "title", "says", "range", "source", "how_sure", "left_range"]
    assert len(text.splitlines()) == 3
    assert rows[0]["says"] == "y = a x b where x < 0"
    assert rows[0]["left_range"] == "stage 'one': steep, found | stage 'two': steep, found"
    assert rows[1]["left_range"] == ""


def test_symbols_are_rows_of_three():
    assert [(each.name, each.unit, each.meaning) for each in symbols(("g", "m/s2", "9.81"))] == [("g", "m/s2", "9.81")]
    with pytest.raises(ValueError, match="unpack"):
        symbols(("g", "m/s2"))
