"""The table of file layouts: one module and one line each."""

from __future__ import annotations

from typing import Final

from tidescour.gauge.columns import read_columns
from tidescour.gauge.raw import Layout
from tidescour.table import Entry

LAYOUTS: Final[dict[str, Entry[Layout]]] = {
    "columns": Entry(
        name="columns",
        title="table with a column of stamps and a column of values",
        function=read_columns,
        says="one row a sample: a stamp, in one column or in two for date and time, and a value",
        symbols=(),
        validity="text separated by commas, semicolons, tabs or blanks, with or without a header; may be gzipped",
        source="keys of the plan: time, level or value, time_format, utc_offset or time_zone, missing",
        confidence="common practice",
    ),
}
