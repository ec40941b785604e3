import runpy
from pathlib import Path

import numpy as np
import pytest

from tidescour.gap.calibrating import Calibrated, Part
from tidescour.gap.campaigns import CampaignTable
from tidescour.gap.discharges import DischargeSeries
from tidescour.gap.held_back import LevelScore
from tidescour.gap.sweep_records import TIDES, ClosureSweep, SweepCurve, SweptTide
from tidescour.plan.models import Site

INVENTED = runpy.run_path(str(Path(__file__).parents[1] / "handoff" / "invented.py"))


@pytest.fixture(scope="session")
def results():
    """A small run with two stages and two openings; its numbers are invented."""
    return INVENTED["invented_results"]()


@pytest.fixture(scope="session")
def make_results():
    """Return the builder of invented runs."""
    return INVENTED["invented_results"]


@pytest.fixture(scope="session")
def make_sweep():
    """Return the builder of a sweep whose peaks are three times the neap in spring, and 0.8 of the flood in the ebb."""

    def build(opening, crest=True, width=True):
        crests = np.linspace(-6.0, 2.0, 9)
        return ClosureSweep(
            stage="invented",
            opening=opening,
            tides=tuple(
                SweptTide(name=name, start_s=0.0, end_s=44700.0, range_m=range_m)
                for name, range_m in zip(TIDES, (3.0, 2.0, 1.0), strict=True)
            ),
            crest=_curve(crests, 4.0 - (crests + 1.0) ** 2 / 9.0) if crest else None,
            width=_curve(np.geomspace(400.0, 8.0, 7), np.arange(1.0, 8.0)) if width else None,
        )

    return build


def _curve(value_m, shape):
    peaks = shape[:, None, None] * np.array([3.0, 2.0, 1.0])[:, None] * np.array([1.0, 0.8])
    return SweepCurve(
        value_m=value_m,
        head_m=0.1 * peaks,
        gap_velocity_m_s=peaks,
        unit_discharge_m2_s=5.0 * peaks,
        mean_basin_level_m=0.1 * shape,
    )


@pytest.fixture(scope="session")
def site():
    return Site(name="Invented gap", datum="invented datum 2026", latitude_deg=53.4)


@pytest.fixture(scope="session")
def make_calibrated():
    """Return the builder of levels: two sines, the routed one 3 cm too low while fitted and 5 cm while held back."""

    def build(days=20.0, held_back=0.25, campaigns=()):
        time_s = 1.8e9 + np.arange(0.0, days * 86400.0, 60.0)
        split_s = time_s[-1] - held_back * (time_s[-1] - time_s[0])
        level_m = np.sin((time_s - 2000.0) / 7116.0)
        routed_m = level_m - np.where(time_s < split_s, 0.03, 0.05)
        kept = np.arange(0, time_s.size, 10)
        kept = np.delete(kept, slice(kept.size // 3, kept.size // 3 + 20))
        parts = [_part("fitted", time_s[0], split_s, 0.03)]
        if held_back:
            parts.append(_part("held back", split_s, time_s[-1], 0.05))
        return Calibrated(
            estimate=None,
            used=(),
            coefficients=(),
            time_s=time_s,
            level_sea_m=1.2 * np.sin(time_s / 7116.0),
            level_routed_m=routed_m,
            level_guess_m=level_m,
            record_time_s=time_s[kept],
            record_level_m=level_m[kept],
            fitted_from_s=float(time_s[0]),
            fitted_to_s=float(split_s),
            guess=None,
            parts=tuple(parts),
            campaigns=tuple(campaigns),
            findings=(),
        )

    return build


def _part(name, start_s, end_s, rms_m):
    routed, guess = (
        LevelScore(count=100, rms_m=factor * rms_m, bias_m=rms_m, range_error_m=0.0, phase_error_s=0.0)
        for factor in (1.0, 3.0)
    )
    return Part(name=name, start_s=float(start_s), end_s=float(end_s), routed=routed, guess=guess)


@pytest.fixture(scope="session")
def make_campaigns():
    """Return the builder of discharges: campaigns of a tide, ten days apart, of a sine of 1000 m3/s."""

    def build(campaigns=1, opening="main gap", storage=True):
        starts = 1.8e9 + 864000.0 * np.arange(max(campaigns, 1))
        time_s = (starts[:, None] + np.arange(0.0, 46800.0, 1800.0)).ravel()
        whole_s = np.arange(1.8e9 - 86400.0, time_s[-1] + 86400.0, 600.0)
        series = [_discharge("by head", whole_s, np.nan, 1.0)]
        series += [_discharge("by storage", whole_s, 40.0, 0.95)] if storage else []
        series += [_discharge("routed", whole_s, np.nan, 0.98)]
        series += [_discharge("measured", time_s, 60.0, 1.05)] if campaigns else []
        return CampaignTable(opening=opening, measured=campaigns > 0, comparisons=(), series=tuple(series))

    return build


def _discharge(source, time_s, error_m3_s, factor):
    return DischargeSeries(
        source=source,
        time_s=time_s,
        discharge_m3_s=factor * 1000.0 * np.sin(time_s / 7116.0),
        standard_error_m3_s=np.full(time_s.size, error_m3_s),
    )
