"""Durations, comparison, protection, layers and growth of a plan whose law may bend and whose bed may have layers.

``python rebend.py PLAN`` prints them as JSON, named as in the results of the program. Like `recompute.py`, from which
it takes levels, flows and cycles, it shares no code with the package and checks nothing.
"""

import json
import math
import sys
import tomllib
from dataclasses import dataclass
from datetime import timedelta
from functools import partial
from pathlib import Path

import numpy as np
from cycles import between, flowing_hours, stage_edges
from formulas import Array, G, alpha_formula, density, viscosity
from growing import Counted, Curve, Growth, along, held_alike, walk
from levels import EPOCH, HOUR, opening_flow, seconds, stage_pieces
from recompute import SIDES, Table, Work, bed_of, place_of
from scipy.integrate import trapezoid
from scipy.optimize import brentq

TIDE_RULES = ("integral", "flow-mean", "cycle-mean")
RULES = (*TIDE_RULES, "peak-held", "mean-held")
FREE_JET = 3.5
STRIDE = 3  # steps of the flow in one step of the chain


@dataclass(frozen=True)
class Felt:
    """What the bed feels at one place in one stage, whatever the layer; one piece, no holes."""

    time_s: Array
    signed_u: Array
    depth_m: Array
    alpha: Array
    alpha_ref: float
    mean_depth_m: float
    smooth: float
    floor: float
    largest_sill_m: float
    edges: Array

    @property
    def speed(self) -> Array:
        return np.maximum(self.signed_u, 0.0)


@dataclass(frozen=True)
class Layer:
    """A row as if the hole lay in one layer all the time."""

    u_c: float
    u_ref: float
    reference: Curve
    hours: dict[str, Array]
    own_m: dict[str, float]
    equilibria_m: dict[str, float]


def climate_of(plan: Table) -> tuple[float, float]:
    water = plan.get("water", {})
    return water.get("temperature_c", 10.0), water.get("salinity_g_kg", 30.0)


def relative_density(plan: Table) -> float:
    return plan["bed"].get("grain_density_kg_m3", 2650.0) / density(*climate_of(plan)) - 1.0


def threshold(plan: Table, place: Table, layer: int, depth_m: float) -> float:
    """Critical velocity of one layer: given, or by van Rijn 1984 and the mean of the logarithmic law."""
    bed = plan["bed"]
    of_layer = bed["layer"][layer - 1] if layer else bed
    if "critical_velocity_m_s" in of_layer:
        return of_layer["critical_velocity_m_s"]
    d50_m = (of_layer["d50_mm"] if layer else place.get("d50_mm", bed["d50_mm"])) / 1000.0
    if bed.get("shields") != "van-rijn":
        return bed_of(plan, {"d50_mm": 1000.0 * d50_m}, depth_m)[1]
    delta = relative_density(plan)
    d_star = d50_m * (G * delta / viscosity(*climate_of(plan)) ** 2) ** (1.0 / 3.0)
    bounds = ((4.0, 0.24, -1.0), (10.0, 0.14, -0.64), (20.0, 0.04, -0.10), (150.0, 0.013, 0.29), (math.inf, 0.055, 0.0))
    theta = next(factor * d_star**power for most, factor, power in bounds if d_star <= most)
    ks = bed.get("roughness_d50", 2.5) * d50_m
    profile = (math.log(30.0 * depth_m / ks) - 1.0 + ks / (30.0 * depth_m)) / 0.40
    return profile * math.sqrt(theta * G * delta * d50_m)


def growth_of(plan: Table) -> Growth:
    scour = plan.get("scour", {})
    return Growth(
        scour.get("law", "explicit"),
        scour.get("time_exponent", 0.4),
        relative_density(plan),
        scour.get("time_constant", 330.0),
        scour.get("equilibrium", "half-alpha"),
    )


def spread_width(width_m: Array, place: Table, length_m: float) -> Array:
    """Width that carries the flow at the end of the protection."""
    spreading = place.get("spreading", "none")
    if spreading == "plane-jet":
        return width_m / np.minimum(FREE_JET / np.sqrt(2.0 * length_m / width_m), 1.0)
    return width_m + (2.0 * place["widening"] * length_m if spreading == "fixed-rate" else 0.0)


def felt_by(work: Work, side: str, length_m: float) -> Felt:
    """Velocity, depth and alpha at the place for a length of the protection."""
    place, opening = place_of(work.plan, work.opening["name"], side), work.opening
    piece, flow, edges = work.pieces[0], work.flows[0], work.edges[0]
    depth_m = piece.level_m[side] - place["bed_level_m"]
    mean_depth_m = float(trapezoid(depth_m, piece.time_s) / np.ptp(piece.time_s))
    sign = 1.0 if side == "basin" else -1.0
    width_m = spread_width(flow.mean_width_m, place, length_m)
    signed_u = sign * place.get("local_velocity_factor", 1.0) * flow.discharge_m3_s / (width_m * depth_m)
    crests = opening["crest_level_m"], opening.get("crest_level_end_m", opening["crest_level_m"])
    span = seconds(work.stage["start"]), seconds(work.stage["end"])
    sill_m = np.interp(piece.time_s, span, crests) - place["bed_level_m"]
    mean_sill_m = 0.5 * sum(crests) - place["bed_level_m"]
    chezy = place.get("chezy_m05_s", 40.0)
    fixed = opening.get(f"alpha_{side}", place.get("alpha"))
    if fixed is None and "alpha_lengths_m" in place:
        fixed = float(np.interp(length_m, place["alpha_lengths_m"], place["alpha_values"]))
    if fixed is None:
        alpha = alpha_formula(sill_m, mean_depth_m, length_m, chezy)
        alpha_ref = float(alpha_formula(mean_sill_m, mean_depth_m, length_m, chezy))
    else:
        alpha, alpha_ref = np.full_like(sill_m, fixed), fixed
    return Felt(
        piece.time_s,
        signed_u,
        depth_m,
        alpha,
        alpha_ref,
        mean_depth_m,
        max(1.0, chezy / 40.0),
        math.sqrt(1.45 * G) / chezy,
        float(sill_m[signed_u > 0.0].max(initial=0.0)),
        edges,
    )


def omega_of(felt: Felt, alpha: Array | float, form: str) -> Array | float:
    """0.5 alpha, or 1 + 3 r0 with r0 of that alpha."""
    if form == "half-alpha":
        return 0.5 * alpha
    return 1.0 + 3.0 * np.maximum((alpha - 1.5) / (5.0 * felt.smooth), felt.floor)


@dataclass(frozen=True)
class Case:
    """One row in one layer, with alpha times a factor."""

    felt: Felt
    growth: Growth
    u_c: float
    factor: float = 1.0

    def curves(self, u: Array, alpha: Array, depth_m: Array) -> tuple[Array, Array]:
        """Strength and limit at each moment."""
        bent = self.factor * alpha
        moved = omega_of(self.felt, bent, self.growth.equilibrium) * u / self.u_c - 1.0
        return self.growth.curves(moved, np.maximum(bent * u - self.u_c, 0.0), depth_m, self.felt.mean_depth_m)

    def steady(self, u: float) -> Curve:
        """The curve of a velocity that is held."""
        held = (np.array([value]) for value in (u, self.felt.alpha_ref, self.felt.mean_depth_m))
        strength, limit_m = self.curves(*held)
        return Curve(float(strength[0]), float(limit_m[0]))

    def chained_in_steps(self) -> Array:
        """Depth from a flat bed at the end of each cycle, each step on the curve of its middle."""
        felt = self.felt
        borders_s = felt.time_s[::STRIDE]
        if borders_s[-1] < felt.time_s[-1]:
            borders_s = np.append(borders_s, felt.time_s[-1])
        middle_s = 0.5 * (borders_s[1:] + borders_s[:-1])
        sampled = (np.interp(middle_s, felt.time_s, values) for values in (felt.speed, felt.alpha, felt.depth_m))
        pairs = list(zip(*(values.tolist() for values in self.curves(*sampled)), strict=True))
        depths = np.concatenate(([0.0], along(pairs, np.diff(borders_s) / HOUR, self.growth.gamma)))
        return np.interp(felt.edges[1:], borders_s, depths)

    def averaged(self, counted: Array) -> Array:
        """The same with strength and limit of each cycle replaced by their means over the hours counted."""
        felt = self.felt
        means = []
        for values in self.curves(felt.speed, felt.alpha, felt.depth_m):
            total = between(felt.time_s, values, felt.edges) if np.isfinite(values).all() else math.inf * counted
            means.append(np.divide(total, counted, out=np.zeros_like(counted), where=counted > 0.0))
        pairs = list(zip(*(mean.tolist() for mean in means), strict=True))
        return along(pairs, counted, self.growth.gamma)

    def depths_m(self, rule: str, u_ref: float) -> Array:
        """Depth from a flat bed at the end of each cycle by one rule."""
        if rule == "integral":
            return self.chained_in_steps()
        if rule == "cycle-mean":
            return self.averaged(np.diff(self.felt.edges) / HOUR)
        flowing = flow_hours(self.felt)
        if rule == "flow-mean":
            return self.averaged(flowing)
        held = self.steady(u_ref if rule == "peak-held" else mean_speed(self.felt))
        return np.array([held.depth_m(h, self.growth.gamma) for h in np.cumsum(flowing)])


def flow_hours(felt: Felt) -> Array:
    return flowing_hours(felt.time_s, felt.signed_u, felt.edges)


def mean_speed(felt: Felt) -> float:
    """Mean velocity over the time with flow."""
    flowing_h = float(flow_hours(felt).sum())
    return float(trapezoid(felt.speed, felt.time_s)) / HOUR / flowing_h if flowing_h else 0.0


def layer_of(felt: Felt, growth: Growth, u_c: float, rules: tuple[str, ...]) -> Layer:
    """One row in one layer under the rules asked for."""
    u_ref = float(felt.speed.max())
    case = Case(felt, growth, u_c)
    reference = case.steady(u_ref)
    hours, own_m = {}, {}
    for rule in rules:
        depths = case.depths_m(rule, u_ref)
        times = np.array([reference.time_h(float(depth), growth.gamma) for depth in depths])
        hours[rule] = np.diff(np.concatenate(([0.0], times)))
        own_m[rule] = float(depths[-1])
    equilibria_m = {
        form: max(float(omega_of(felt, felt.alpha_ref, form)) * u_ref / u_c - 1.0, 0.0) * felt.mean_depth_m
        for form in ("half-alpha", "turbulence")
    }
    return Layer(u_c, u_ref, reference, hours, own_m, equilibria_m)


# --- places ----------------------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Grown:
    """One stage of a place under one rule; depths over the growth factor."""

    start_m: float
    end_m: float
    at_cycles_m: Array
    first_layer: int
    bottoms: list[int]
    spent_h: list[float]


def tops_of(plan: Table, place: Table) -> list[float]:
    """Depth at which each layer is met, over the growth factor."""
    layers = plan["bed"].get("layer", [])
    return [(place["bed_level_m"] - layer["top_level_m"]) / place.get("growth_factor", 1.0) for layer in layers]


def rows_of(works: list[Work], side: str, length_m: float, rules: tuple[str, ...]) -> list[tuple[Felt, list[Layer]]]:
    plan, growth = works[0].plan, growth_of(works[0].plan)
    place = place_of(plan, works[0].opening["name"], side)
    rows = []
    for work in works:
        felt = felt_by(work, side, length_m)
        thresholds = [
            threshold(plan, place, i, felt.mean_depth_m) for i in range(len(plan["bed"].get("layer", [])) + 1)
        ]
        rows.append((felt, [layer_of(felt, growth, u_c, rules) for u_c in thresholds]))
    return rows


def grown_by(plan: Table, place: Table, rows: list[tuple[Felt, list[Layer]]], rule: str) -> list[Grown]:
    """The chain of stages under one rule."""
    gamma, tops_m = growth_of(plan).gamma, tops_of(plan, place)
    depth_m = place.get("start_depth_m", 0.0) / place.get("growth_factor", 1.0)
    stages = []
    for _, layers in rows:
        start_m = depth_m
        counted = [Counted(layer.reference, layer.hours[rule]) for layer in layers]
        at_cycles_m, bottoms, spent_h = walk(counted, tops_m, start_m, gamma)
        depth_m = float(at_cycles_m[-1])
        first_layer = sum(start_m >= top_m for top_m in tops_m)
        stages.append(Grown(start_m, depth_m, at_cycles_m, first_layer, bottoms, spent_h))
    return stages


def final_m(works: list[Work], side: str, rule: str, length_m: float) -> float:
    place = place_of(works[0].plan, works[0].opening["name"], side)
    rows = rows_of(works, side, length_m, (rule,))
    return place.get("growth_factor", 1.0) * grown_by(works[0].plan, place, rows, rule)[-1].end_m


def root(shortest_m: float, asked_m) -> float:
    """The length that asks for itself, or the shortest."""
    if asked_m(shortest_m) <= shortest_m:
        return shortest_m
    return float(brentq(lambda length_m: asked_m(length_m) - length_m, shortest_m, asked_m(shortest_m), xtol=1e-3))


def stamp(time_s: float) -> str:
    return (EPOCH + timedelta(seconds=float(time_s))).isoformat()


def day_reached(rows: list[tuple[Felt, list[Layer]]], stages: list[Grown], limit_m: float, gamma: float) -> str | None:
    """When a hole has a depth, both over the growth factor; within a cycle by its effective hours."""
    for (felt, layers), stage in zip(rows, stages, strict=True):
        before = np.concatenate(([stage.start_m], stage.at_cycles_m[:-1]))
        for i, after_m in enumerate(stage.at_cycles_m):
            if after_m > limit_m:
                # Only asked where no layer changes within that cycle.
                curve = layers[stage.bottoms[i]].reference
                first_h, last_h = curve.time_h(float(before[i]), gamma), curve.time_h(float(after_m), gamma)
                part = (curve.time_h(limit_m, gamma) - first_h) / (last_h - first_h)
                return stamp(felt.edges[i] + part * (felt.edges[i + 1] - felt.edges[i]))
    return None


def needed_alpha(felt: Felt, growth: Growth, layer: Layer, rule: str) -> float:
    """Alpha that a rule needs for the depth of the integral from a flat bed."""
    if rule == "integral":
        return felt.alpha_ref

    def depth_m(factor: float) -> float:
        return float(Case(felt, growth, layer.u_c, factor).depths_m(rule, layer.u_ref)[-1])

    return felt.alpha_ref * held_alike(depth_m, layer.own_m["integral"])


def place_results(works: list[Work], side: str) -> dict[str, list[Table]]:
    plan, name = works[0].plan, works[0].opening["name"]
    place, growth = place_of(plan, name, side), growth_of(plan)
    driving, factor = plan.get("scour", {}).get("tide", "integral"), place.get("growth_factor", 1.0)
    rows = rows_of(works, side, place["length_m"], RULES)
    chains = {rule: grown_by(plan, place, rows, rule) for rule in RULES}
    names = ["surface", *(layer["name"] for layer in plan["bed"].get("layer", []))]
    durations, comparison, growing, weights = [], [], [], []
    for i, (work, (felt, layers)) in enumerate(zip(works, rows, strict=True)):
        key = {"stage": work.stage["name"], "opening": name, "side": side}
        grown = chains[driving][i]
        layer = layers[grown.first_layer]
        total_h = {rule: float(layer.hours[rule].sum()) for rule in RULES}
        q, r = (1.7, 0.2) if growth.name == "explicit" else (4.3 * growth.gamma, 1.0 - 2.0 * growth.gamma)
        weight = sum(
            spent_h * max(felt.alpha_ref * each.u_ref - each.u_c, 0.0) ** (q / growth.gamma)
            for each, spent_h in zip(layers, grown.spent_h, strict=True)
        )
        weights.append(weight * felt.mean_depth_m ** (r / growth.gamma))
        durations.append(
            key
            | {
                "cycles": len(felt.edges) - 1,
                "reference_velocity_m_s": layer.u_ref,
                "alpha": felt.alpha_ref,
                "critical_velocity_m_s": layer.u_c,
                "reference_depth_m": felt.mean_depth_m,
                **{f"effective_duration_{rule.replace('-', '_')}_h": total_h[rule] for rule in TIDE_RULES},
                "stage_depth_m": factor * layer.own_m[driving],
                "equivalent_start_h": layer.reference.time_h(grown.start_m, growth.gamma),
                "start_depth_m": factor * grown.start_m,
                "end_depth_m": factor * grown.end_m,
                "growth_factor": factor,
                "mean_end_velocity_m_s": mean_speed(felt),
                "flow_duration_h": float(flow_hours(felt).sum()),
                "turbulence": (float(omega_of(felt, felt.alpha_ref, "turbulence")) - 1.0) / 3.0,
                "equilibrium_depth_half_alpha_m": layer.equilibria_m["half-alpha"],
                "equilibrium_depth_turbulence_m": layer.equilibria_m["turbulence"],
                "bed_layer": names[grown.first_layer],
            }
        )
        # The rules of one row stand in the layer in which the driving one starts it.
        comparison += [
            key
            | {
                "rule": rule,
                "effective_duration_h": total_h[rule],
                "stage_depth_m": factor * layer.own_m[rule],
                "end_depth_m": factor * chains[rule][i].end_m,
                "alpha": felt.alpha_ref,
                "alpha_for_same_depth": needed_alpha(felt, growth, layer, rule),
            }
            for rule in RULES
        ]
        growing += [
            key | {"time_utc": stamp(at_s), "depth_m": factor * float(depth_m)}
            for at_s, depth_m in zip(felt.edges[1:], grown.at_cycles_m, strict=True)
        ]
    for row, weight in zip(durations, weights, strict=True):
        row["share_percent"] = 100.0 * weight / sum(weights)

    cot, margin = place["failure_slope_cot"], place.get("depth_margin_factor", 1.0)
    shortest_m = 6.0 * max(felt.largest_sill_m for felt, _ in rows)
    deep = partial(final_m, works, side, driving)
    length_m = root(shortest_m, lambda length_m: cot * margin * deep(length_m))
    fall = (cot - place["upstream_slope_cot"]) / 2.0
    slide_m = root(shortest_m, lambda length_m: fall * margin * deep(length_m))
    protection = {
        "opening": name,
        "side": side,
        "final_depth_m": factor * chains[driving][-1].end_m,
        **{f"final_depth_{rule.replace('-', '_')}_m": factor * chains[rule][-1].end_m for rule in RULES},
        "depth_margin_factor": margin,
        "length_required_m": length_m,
        "length_single_slide_m": slide_m if slide_m > shortest_m else fall * margin * deep(shortest_m),
        "length_minimum_m": shortest_m,
        "upstream_slope_cot": place["upstream_slope_cot"],
        "length_reached": day_reached(rows, chains[driving], place["length_m"] / (cot * margin) / factor, growth.gamma),
    }
    return {"durations": durations, "comparison": comparison, "growth": growing, "protection": [protection]}


def rebend(path: Path) -> dict[str, list[Table]]:
    """All numbers of the plan at `path`."""
    with path.open("rb") as file:
        plan = tomllib.load(file)
    openings: dict[str, list[Work]] = {}
    for stage, pieces in zip(plan["stage"], stage_pieces(plan, path.parent), strict=True):
        for opening in stage["opening"]:
            flows = [opening_flow(plan, path.parent, stage, opening, piece) for piece in pieces]
            edges = stage_edges(stage, opening, pieces, flows)
            openings.setdefault(opening["name"], []).append(Work(plan, stage, opening, pieces, flows, edges))
    results: dict[str, list[Table]] = {}
    for works in openings.values():
        for side in SIDES:
            for table, rows in place_results(works, side).items():
                results.setdefault(table, []).extend(rows)
    return results


if __name__ == "__main__":
    json.dump(rebend(Path(sys.argv[1])), sys.stdout, indent=1)
