"""Builders shared by the tests of this folder."""

import numpy as np
import pytest

from tidescour.bed.records import BedHistory
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.plan.models_bed import PlaceBed, Scour
from tidescour.scour.laws import LAWS
from tidescour.scour.records import CycleSet, EffectiveDuration, RowDurations

# Time over t1 and depth over water depth of no model in particular: bent, and through h0 at t1.
MODEL = ((0.001, 0.09), (0.02, 0.30), (0.2, 0.62), (1.0, 1.0), (20.0, 1.9))


@pytest.fixture(scope="session")
def law_of():
    """Return a growth law by its name in the plan, with numbers of the plan; a model curve has one of its own."""

    def build(name, density=1.6, **numbers):
        curve = {"curve_points": MODEL} if name == "model-curve" else {}
        return LAWS[name].function(density, Scour(**(curve | numbers)))

    return build


@pytest.fixture(scope="session")
def bed_row():
    """What the bed feels, from a signed velocity."""

    def build(time, velocity, depth=10.0, alpha=2.5, critical=0.45, covered=None, alpha_ref=None, reference_depth=None):
        alphas, depths = np.broadcast_to(alpha, time.shape), np.broadcast_to(depth, time.shape)
        return BedHistory(
            stage="sill",
            opening="main gap",
            side="basin",
            time_s=time,
            covered=np.ones(time.size, dtype=bool) if covered is None else covered,
            signed_velocity_m_s=velocity,
            depth_m=depths,
            alpha=alphas,
            alpha_ref=float(np.mean(alphas)) if alpha_ref is None else alpha_ref,
            turbulence=(alphas - 1.5) / 5.0,
            turbulence_ref=(float(np.mean(alphas)) - 1.5) / 5.0,
            critical_velocity_m_s=critical,
            reference_depth_m=float(np.mean(depths)) if reference_depth is None else reference_depth,
            protection_length_m=90.0,
            submerged_relative_density=1.65,
        )

    return build


@pytest.fixture(scope="session")
def duration_row():
    """A row of steady flow of so many hours at its reference, in one cycle, on the law's own curve or a given one."""

    def build(
        law, velocity, hours, alpha=2.5, critical=0.42, depth=12.0, stage="sill", start=0.0, rate=None, scale=np.inf
    ):
        excess = max(alpha * velocity - critical, 0.0)
        strength = law.coefficient * excess**law.velocity_exponent * depth**law.depth_exponent
        growth_rate = strength ** (1.0 / law.time_exponent) if rate is None else rate
        duration = EffectiveDuration(
            stage=stage,
            opening="main gap",
            side="basin",
            reference_velocity_m_s=velocity,
            alpha=alpha,
            critical_velocity_m_s=critical,
            reference_depth_m=depth,
            turbulence=(alpha - 1.5) / 5.0,
            reference_excess_m_s=excess,
            growth_rate=growth_rate,
            power_rate=growth_rate,
            scale_m=scale,
            equilibrium_half_alpha_m=np.nan,
            equilibrium_turbulence_m=np.nan,
            cycles=CycleSet(start_s=[start], end_s=[start + 3600.0 * max(hours, 1.0)]),
            integral_h=[hours],
            flow_mean_h=[0.5 * hours],
            cycle_mean_h=[0.25 * hours],
            peak_held_h=[2.0 * hours],
            mean_held_h=[0.75 * hours],
            flow_h=[hours],
            peak_velocity_m_s=velocity,
            mean_velocity_m_s=velocity,
        )
        return RowDurations(layers=(duration,))

    return build


@pytest.fixture(scope="session")
def head_stage():
    """A stage of which only the head matters, with one opening."""

    def build(time, head, measured=False, covered=None, given=None):
        nothing = np.full(time.size, np.nan)
        opening = OpeningFlow(
            name="main gap",
            level_sea_m=head,
            crest_level_m=np.full(time.size, -6.0),
            width_m=np.full(time.size, 400.0),
            discharge_m3_s=nothing if given is None else given,
            gap_velocity_m_s=nothing,
            flow_width_m=nothing,
            given=given is not None,
        )
        return StageFlow(
            stage="sill",
            time_s=time,
            level_sea_m=head,
            level_basin_m=np.zeros(time.size),
            covered=np.ones(time.size, dtype=bool) if covered is None else covered,
            measured=measured,
            routed=False,
            openings=(opening,),
            inflow_m3_s=np.zeros(time.size),
        )

    return build


@pytest.fixture(scope="session")
def place():
    """The basin side of the main gap."""

    def build(**changes):
        values = {
            "opening": "main gap",
            "side": "basin",
            "length_m": 90.0,
            "bed_level_m": -9.0,
            "chezy_m05_s": 45.0,
            "widening": 0.0,
            "alpha": None,
            "alpha_basis": "integral",
            "local_velocity_factor": 1.0,
            "failure_slope_cot": 10.0,
            "start_depth_m": 0.0,
            "d50_mm": None,
        }
        return PlaceBed(**(values | changes))

    return build
