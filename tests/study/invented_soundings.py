"""Invented holes and soundings: no number here is a fact of any site, or the output of the program."""

from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np

from tidescour.plan.models import Opening, Plan, Site, Stage
from tidescour.plan.models_bed import PlaceBed
from tidescour.plan.models_survey import Sounding, Soundings
from tidescour.scour.laws import LAWS
from tidescour.scour.records import CycleSet, EffectiveDuration, RowDurations
from tidescour.study.growth_factor import Hole, Scatter
from tidescour.study.soundings import SoundingResults, sounded_place, sounding_notes, soundings_at
from tidescour.units import seconds_since_epoch

LAW = LAWS["explicit"].function(1.65)
START = datetime(2027, 4, 1, tzinfo=UTC)
START_S = seconds_since_epoch(START)
DAY_S = 86400.0


def invented_row(state, start_s, end_s, cycles=1, scale_m=np.inf, tops=(0.0,), weaker=(1.0,)):
    """Return a row whose cycles, all alike, add so much to depth**(1 / gamma); lower layers add less."""
    edges = np.linspace(start_s, end_s, cycles + 1)
    hours = np.ones(cycles)
    return RowDurations(
        layers=tuple(
            EffectiveDuration(
                stage="invented",
                opening="main gap",
                side="basin",
                reference_velocity_m_s=1.0,
                alpha=2.0,
                critical_velocity_m_s=0.4,
                reference_depth_m=10.0,
                turbulence=0.1,
                reference_excess_m_s=1.6,
                growth_rate=factor * state / cycles,
                power_rate=factor * state / cycles,
                scale_m=scale_m,
                equilibrium_half_alpha_m=np.nan,
                equilibrium_turbulence_m=np.nan,
                cycles=CycleSet(start_s=edges[:-1], end_s=edges[1:]),
                integral_h=hours,
                flow_mean_h=hours,
                cycle_mean_h=hours,
                peak_held_h=hours,
                mean_held_h=hours,
                flow_h=hours,
                peak_velocity_m_s=1.0,
                mean_velocity_m_s=0.5,
            )
            for factor in weaker
        ),
        top_depth_m=tops,
    )


def invented_hole(states, *, cycles=1, law=LAW, start_depth_m=0.0, growth_factor=1.0, days=30.0, **layers):
    """Return a hole of stages of equal length that add these states."""
    ends_s = START_S + DAY_S * days * np.arange(len(states) + 1)
    return Hole(
        rows=tuple(
            invented_row(state, *ends_s[number : number + 2], cycles, **layers) for number, state in enumerate(states)
        ),
        law=law,
        rule="integral",
        start_s=float(ends_s[0]),
        end_s=float(ends_s[-1]),
        start_depth_m=start_depth_m,
        growth_factor=growth_factor,
    )


def invented_place(**changes):
    values = {
        "opening": "main gap",
        "side": "basin",
        "length_m": 90.0,
        "bed_level_m": -9.0,
        "chezy_m05_s": 40.0,
        "widening": 0.0,
        "alpha": None,
        "alpha_basis": "integral",
        "local_velocity_factor": 1.0,
        "failure_slope_cot": 10.0,
        "start_depth_m": 0.0,
        "d50_mm": 0.25,
    }
    return PlaceBed(**(values | changes))


def invented_plan(soundings, **changes):
    """Return a plan of two stages of thirty days, the first five days late, with soundings of the main gap."""
    opening = Opening(name="main gap", crest_level_m=-6.0, width_m=400.0, relation="broad-crest")
    stages = tuple(
        Stage(
            name=name,
            start=START + timedelta(days=30 * number),
            end=START + timedelta(days=30 * (number + 1)),
            opening=(opening,),
            sea=sea,
            basin="measured" if sea == "measured" else "routed",
            **planned,
        )
        for number, (name, sea, planned) in enumerate(
            (
                (
                    "sill to -6",
                    "measured",
                    {"planned_start": START, "planned_end": START + timedelta(days=25)},
                ),
                ("sill to -4", "tide", {}),
            )
        )
    )
    values = {
        "folder": Path("invented"),
        "file": Path("invented/plan.toml"),
        "site": Site(name="Invented gap", datum="invented datum 2026", latitude_deg=53.4),
        "stage": stages,
        "soundings": Soundings(),
        "sounding": tuple(soundings),
    }
    return Plan(**(values | changes))


def sounding(day, depth_m, error_m=0.3, side="basin", **others):
    return Sounding(
        date=START + timedelta(days=day),
        opening="main gap",
        side=side,
        depth_m=depth_m,
        standard_error_m=error_m,
        **others,
    )


def invented_results(soundings=None, scatter=None, **place):
    """Return results of two places, that on the sea side never sounded; 5 m as planned after 30 days, 8 m after 60."""
    plan = invented_plan([sounding(30.0, 3.6)] if soundings is None else soundings)
    hole = invented_hole((5.0**2.5, 8.0**2.5 - 5.0**2.5), cycles=4, growth_factor=place.get("growth_factor", 1.0))
    places = tuple(
        sounded_place(each, hole, soundings_at(plan, each), scatter or Scatter(prior=0.3, growth=0.1))
        for each in (invented_place(**place), invented_place(**place, side="sea"))
    )
    findings = (*sounding_notes(plan, places), *(finding for each in places for finding in each.findings))
    return SoundingResults(plan=plan, law=LAW, places=places, files=(), findings=findings)
