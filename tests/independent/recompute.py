"""The main numbers of a plan, computed a second time: numpy, scipy and the formulas, no code of the package.

``python recompute.py PLAN`` prints them as JSON, named as in the results of the program. It knows what the plans
beside it need (a given sea level, tidal constants, a measured pair, a given velocity, a surveyed sill) and checks
nothing. Only the
prediction from tidal constants leans on a library for tides.
"""

import json
import sys
import tomllib
from dataclasses import dataclass
from datetime import timedelta
from pathlib import Path

import numpy as np
from cycles import between, flowing_hours, stage_edges
from formulas import Array, Law, alpha_formula, critical_velocity, density, growth_law, viscosity
from levels import EPOCH, HOUR, Flow, Piece, Table, opening_flow, own_pieces, seconds, stage_pieces
from scipy.integrate import trapezoid
from scipy.optimize import brentq

RULES = ("integral", "flow-mean", "cycle-mean")
SIDES = ("basin", "sea")


@dataclass(frozen=True)
class Work:
    """One opening in one stage: all that does not depend on the length of the protection."""

    plan: Table
    stage: Table
    opening: Table
    pieces: list[Piece]
    flows: list[Flow]
    edges: list[Array]


@dataclass(frozen=True)
class Reach:
    """What the bed feels at one place in one piece."""

    time_s: Array
    signed_u: Array
    speed: Array
    depth_m: Array
    sill_m: Array
    excess: Array
    alpha: Array


@dataclass(frozen=True)
class Row:
    """One line of durations: the references, and the hours of each rule cycle by cycle."""

    law: Law
    u_ref: float
    alpha_ref: float
    u_c: float
    depth_ref_m: float
    hours: dict[str, Array]
    peak_m_s: float
    largest_sill_m: float

    def weight(self, rule: str) -> float:
        """A_ref^(1/gamma) t_eff: what the row adds to depth^(1/gamma)."""
        e_ref = max(self.alpha_ref * self.u_ref - self.u_c, 0.0)
        a_ref = self.law.c * e_ref**self.law.q * self.depth_ref_m**self.law.r
        return a_ref ** (1.0 / self.law.gamma) * float(self.hours[rule].sum())


def place_of(plan: Table, opening_name: str, side: str) -> Table:
    """The protection on that side with what the opening has different."""
    whole = plan["protection"][side]
    return whole | whole.get("opening", {}).get(opening_name, {})


def bed_of(plan: Table, place: Table, depth_m: float) -> tuple[float, float]:
    """Submerged relative density and critical velocity."""
    bed, water = plan.get("bed", {}), plan.get("water", {})
    climate = water.get("temperature_c", 10.0), water.get("salinity_g_kg", 30.0)
    delta = bed.get("grain_density_kg_m3", 2650.0) / density(*climate) - 1.0
    if "critical_velocity_m_s" in bed:
        return delta, bed["critical_velocity_m_s"]
    d50_m = place.get("d50_mm", bed.get("d50_mm")) / 1000.0
    ks_per_d50, form = bed.get("roughness_d50", 2.5), bed.get("shields", "soulsby")
    return delta, critical_velocity(d50_m, delta, viscosity(*climate), depth_m, ks_per_d50, form)


def end_velocity(flow: Flow, depth_m: Array, place: Table, side: str, length_m: float) -> Array:
    """Velocity at the end of the protection, positive towards `side`; there it is 0 where this is negative."""
    sign = 1.0 if side == "basin" else -1.0
    if flow.end_m_s is not None:
        return sign * flow.end_m_s
    width = flow.mean_width_m + 2.0 * place.get("widening", 0.0) * length_m
    return sign * place.get("local_velocity_factor", 1.0) * flow.discharge_m3_s / (width * depth_m)


def hours_of(reach: Reach, edges: Array, law: Law, e_ref: float, depth_ref_m: float) -> dict[str, Array]:
    """Effective hours of each cycle under the three rules."""
    if e_ref <= 0.0:
        return {rule: np.zeros(len(edges) - 1) for rule in RULES}
    relative = (reach.excess / e_ref) ** law.q * (reach.depth_m / depth_ref_m) ** law.r
    total = between(reach.time_s, relative, edges)
    hours = {"integral": between(reach.time_s, relative ** (1.0 / law.gamma), edges)}
    for rule, counted in (
        ("flow-mean", flowing_hours(reach.time_s, reach.signed_u, edges)),
        ("cycle-mean", np.diff(edges) / HOUR),
    ):
        mean = np.divide(total, counted, out=np.zeros_like(total), where=counted > 0.0)
        hours[rule] = mean ** (1.0 / law.gamma) * counted
    return hours


def row_of(work: Work, side: str, length_m: float) -> Row:
    """The row of one stage and place for a length of the protection."""
    plan, opening, pieces = work.plan, work.opening, work.pieces
    place = place_of(plan, opening["name"], side)
    covered_s = sum(piece.time_s[-1] - piece.time_s[0] for piece in pieces)
    mean_level_m = sum(float(trapezoid(piece.level_m[side], piece.time_s)) for piece in pieces) / covered_s
    depth_ref_m = mean_level_m - place["bed_level_m"]
    delta, u_c = bed_of(plan, place, depth_ref_m)
    law = growth_law(plan.get("scour", {}).get("law", "explicit"), delta)
    fixed = opening.get(f"alpha_{side}", place.get("alpha"))
    crests = opening["crest_level_m"], opening.get("crest_level_end_m", opening["crest_level_m"])
    span = seconds(work.stage["start"]), seconds(work.stage["end"])

    def alpha_at(sill_m: Array) -> Array:
        return (
            np.full_like(sill_m, fixed) if fixed else alpha_formula(sill_m, depth_ref_m, length_m, place["chezy_m05_s"])
        )

    reaches = []
    for piece, flow in zip(pieces, work.flows, strict=True):
        depth_m = piece.level_m[side] - place["bed_level_m"]
        signed = end_velocity(flow, depth_m, place, side, length_m)
        speed = np.maximum(signed, 0.0)
        sill_m = np.interp(piece.time_s, span, crests) - place["bed_level_m"]
        alpha = alpha_at(sill_m)
        excess = np.maximum(alpha * speed - u_c, 0.0)
        reaches.append(Reach(piece.time_s, signed, speed, depth_m, sill_m, excess, alpha))

    speed, excess, alpha, sill_m = (
        np.concatenate([getattr(reach, name) for reach in reaches]) for name in ("speed", "excess", "alpha", "sill_m")
    )
    u_ref = plan.get("scour", {}).get("reference_velocity_m_s", float(speed.max()))
    alpha_ref = float(alpha_at(np.array([0.5 * sum(crests) - place["bed_level_m"]]))[0])
    if alpha_ref * u_ref <= u_c and excess.max() > 0.0:
        u_ref, alpha_ref = float(speed[excess.argmax()]), float(alpha[excess.argmax()])
    e_ref = alpha_ref * u_ref - u_c
    parts = [hours_of(reach, edges, law, e_ref, depth_ref_m) for reach, edges in zip(reaches, work.edges, strict=True)]
    return Row(
        law,
        u_ref,
        alpha_ref,
        u_c,
        depth_ref_m,
        {rule: np.concatenate([part[rule] for part in parts]) for rule in RULES},
        float(speed.max()),
        float(sill_m[speed > 0.0].max(initial=0.0)),
    )


# --- chain and length ------------------------------------------------------------------------------------------------


def chained(rows: list[Row], rule: str, start_m: float) -> list[float]:
    """Depth after each row: h^(1/gamma) adds up, which is equivalent time for one law."""
    gamma = rows[0].law.gamma
    total = start_m ** (1.0 / gamma) + np.cumsum([row.weight(rule) for row in rows])
    return [float(h) for h in total**gamma]


def required_length(works: list[Work], side: str, rule: str, place: Table) -> float:
    """The root of L = cot x final depth(L), or six sills where that is longer."""
    start_m = place.get("start_depth_m", 0.0)
    shortest_m = 6.0 * max(row_of(work, side, place["length_m"]).largest_sill_m for work in works)

    def too_short_by(length_m: float) -> float:
        rows = [row_of(work, side, length_m) for work in works]
        return place["failure_slope_cot"] * chained(rows, rule, start_m)[-1] - length_m

    if too_short_by(shortest_m) <= 0.0:
        return shortest_m
    return float(brentq(too_short_by, shortest_m, shortest_m + 2.0 * too_short_by(shortest_m), xtol=1e-4))


def peak_gap_velocity(work: Work, side: str) -> float | None:
    """Highest gap velocity of the flow to that side; nothing for a given end velocity."""
    if "end_velocity_series" in work.opening:
        return None
    sign = 1.0 if side == "basin" else -1.0
    return max(float((sign * flow.gap_m_s).max(initial=0.0)) for flow in work.flows)


def place_results(works: list[Work], side: str) -> tuple[list[Table], Table]:
    """Rows of durations and the row of protection of one opening and side."""
    plan, name = works[0].plan, works[0].opening["name"]
    place = place_of(plan, name, side)
    driving, start_m = plan.get("scour", {}).get("tide", "integral"), place.get("start_depth_m", 0.0)
    rows = [row_of(work, side, place["length_m"]) for work in works]
    ends_m = chained(rows, driving, start_m)
    whole = sum(row.weight(driving) for row in rows)
    lines = [
        {
            "stage": work.stage["name"],
            "opening": name,
            "side": side,
            "cycles": len(row.hours["integral"]),
            "reference_velocity_m_s": row.u_ref,
            "alpha": row.alpha_ref,
            "critical_velocity_m_s": row.u_c,
            "reference_depth_m": row.depth_ref_m,
            **{f"effective_duration_{rule.replace('-', '_')}_h": float(row.hours[rule].sum()) for rule in RULES},
            "stage_depth_m": row.weight(driving) ** row.law.gamma,
            "end_depth_m": end_m,
            "peak_gap_velocity_m_s": peak_gap_velocity(work, side),
            "peak_end_velocity_m_s": row.peak_m_s,
            "share_percent": 100.0 * row.weight(driving) / whole if whole else 0.0,
        }
        for work, row, end_m in zip(works, rows, ends_m, strict=True)
    ]
    length_m = required_length(works, side, driving, place)
    again = [row_of(work, side, length_m) for work in works]
    largest = max(again, key=lambda row: row.weight(driving))
    return lines, {
        "opening": name,
        "side": side,
        "final_depth_m": ends_m[-1],
        **{f"final_depth_{rule.replace('-', '_')}_m": chained(rows, rule, start_m)[-1] for rule in RULES},
        "length_required_m": length_m,
        "alpha_at_required": largest.alpha_ref if whole else None,
    }


def cycle_lines(work: Work) -> list[Table]:
    """Start of every cycle and the hours of both sides under the three rules."""
    starts = np.concatenate([edges[:-1] for edges in work.edges])
    rows = {side: row_of(work, side, place_of(work.plan, work.opening["name"], side)["length_m"]) for side in SIDES}
    return [
        {
            "stage": work.stage["name"],
            "opening": work.opening["name"],
            "cycle": i + 1,
            "start": (EPOCH + timedelta(seconds=float(start_s))).isoformat(),
            **{
                f"{side}_effective_{rule.replace('-', '_')}_h": float(row.hours[rule][i])
                for side, row in rows.items()
                for rule in RULES
            },
        }
        for i, start_s in enumerate(starts)
    ]


def recompute(path: Path) -> dict[str, list[Table]]:
    """All numbers of the plan at `path`."""
    with path.open("rb") as file:
        plan = tomllib.load(file)
    openings: dict[str, list[Work]] = {}
    for stage, pieces in zip(plan["stage"], stage_pieces(plan, path.parent), strict=True):
        for opening in stage["opening"]:
            met = own_pieces(plan, path.parent, stage, opening, pieces)
            flows = [opening_flow(plan, path.parent, stage, opening, piece) for piece in met]
            edges = stage_edges(stage, opening, pieces, flows)
            openings.setdefault(opening["name"], []).append(Work(plan, stage, opening, met, flows, edges))
    places = [place_results(works, side) for works in openings.values() for side in SIDES]
    return {
        "durations": [line for lines, _ in places for line in lines],
        "protection": [line for _, line in places],
        "cycles": [line for works in openings.values() for work in works for line in cycle_lines(work)],
    }


if __name__ == "__main__":
    json.dump(recompute(Path(sys.argv[1])), sys.stdout, indent=1)
