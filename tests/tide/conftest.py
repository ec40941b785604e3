"""Tides, records and published tables that the tests of this folder share."""

import csv
import gzip
from pathlib import Path

import numpy as np
import pytest

from tidescour.gauge.records import FAIL, PASS, GaugeRecord
from tidescour.tide.library import predicted_tide
from tidescour.tide.records import TideConstants

TESTS = Path(__file__).parent.parent

START_S = float(np.datetime64("2026-03-01T00:00", "s").astype(np.int64))


@pytest.fixture
def published():
    """Return the rows of a table of published values as dictionaries."""

    def rows(name):
        text = (TESTS / "published" / name).read_text(encoding="utf-8")
        return list(csv.DictReader(line for line in text.splitlines() if not line.startswith("#")))

    return rows


@pytest.fixture
def excerpt():
    """Return the text of a packed excerpt of a record."""

    def text(name):
        return gzip.decompress((TESTS / "data" / "tide" / name).read_bytes()).decode("ascii")

    return text


@pytest.fixture
def times():
    """Return evenly spaced times, seconds since 1970."""

    def even(days, step_s=3600.0, start_s=START_S):
        return start_s + np.arange(0.0, days * 86400.0, step_s)

    return even


@pytest.fixture
def constants():
    """Return constants from a mapping of names to amplitude and phase."""

    def made(table, mean_m=0.3, latitude_deg=53.4):
        return TideConstants(
            constituents=tuple(table),
            amplitude_m=[row[0] for row in table.values()],
            phase_deg=[row[1] for row in table.values()],
            mean_m=mean_m,
            latitude_deg=latitude_deg,
        )

    return made


@pytest.fixture
def north_sea(constants):
    """Return an invented tide of the kind found in the southern North Sea, K2 at the equilibrium ratio to S2."""
    return constants(
        {
            "M2": (1.5, 60.0),
            "S2": (0.42, 120.0),
            "N2": (0.25, 35.0),
            "K2": (0.272 * 0.42, 110.0),
            "K1": (0.08, 350.0),
            "O1": (0.10, 190.0),
            "P1": (0.331 * 0.08, 345.0),
            "M4": (0.11, 130.0),
            "MS4": (0.07, 185.0),
            "M6": (0.06, 20.0),
        }
    )


@pytest.fixture
def record(times):
    """Return the record that a gauge would read of a tide, all samples good but those that `bad` marks."""

    def read(tide, days=30.0, step_s=3600.0, side="sea", bad=None, noise_m=None, start_s=START_S):
        time_s = times(days, step_s, start_s)
        level_m = tide.mean_m + predicted_tide(tide, time_s) + (0.0 if noise_m is None else noise_m)
        flag = np.full(time_s.size, PASS, dtype=np.int8)
        if bad is not None:
            flag[bad] = FAIL
        return GaugeRecord(side=side, time_s=time_s, level_m=level_m, flag=flag, step_s=step_s, files=())

    return read
