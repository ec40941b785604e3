"""`tidescour soundings`: growth against soundings, a factor for each place, and the forecast from the last one on."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from tidescour.cli.options import json_option, out_option, plan_argument, quiet_option
from tidescour.cli.speaking import text_table, wrapped
from tidescour.cli.studying import Study, run_study

if TYPE_CHECKING:
    from tidescour.report.pictures import Picture
    from tidescour.study.soundings import SoundedPlace, SoundingResults
    from tidescour.study.stops import StopDate


@click.command(short_help="Compare growth with soundings.")
@plan_argument
@out_option
@click.option("--no-figures", is_flag=True, help="Leave the pictures out, which is faster.")
@json_option
@quiet_option
def soundings(plan: Path, out: Path | None, no_figures: bool, as_json: bool, quiet: bool) -> int:
    """Compare the growth that PLAN gives with its soundings, and carry the forecast on from the last of them.

    One growth factor a place is estimated from [[sounding]] of the plan; it multiplies the depth of the growth law.
    Prints the lines to put into the plan, and when the given length, or a depth or slope at which the works stop, is
    reached; with --out writes soundings.csv and what stands behind it.

    \b
    Example:
      tidescour soundings mysite/plan.toml --out mysite/soundings
    """
    from tidescour import pipeline
    from tidescour.handoff.soundings_tables import soundings_files

    study = Study(
        command="soundings",
        purpose="soundings",
        compute=pipeline.soundings,
        files=soundings_files,
        pictures=_pictures,
        document=_document,
        text=_text,
    )
    return run_study(study, plan, out, no_figures=no_figures, as_json=as_json, quiet=quiet)


def _pictures(results: SoundingResults) -> tuple[Picture, ...]:
    from tidescour.report.figures_soundings import soundings_pictures

    return tuple(soundings_pictures(results))


def _document(results: SoundingResults) -> dict[str, object]:
    from tidescour.handoff.soundings_tables import plan_lines, soundings_tables
    from tidescour.handoff.tables import row_objects

    tables = {table.name: row_objects(table) for table in soundings_tables(results)}
    return {**tables, "plan_lines": plan_lines(results)}


def _text(results: SoundingResults) -> str:
    from tidescour.handoff.conventions import SIDES_TEXT
    from tidescour.handoff.soundings_tables import plan_lines

    plan = results.plan
    head = (
        plan.site.name,
        f"law {results.law.name}: {results.law.text}; growth driven by {plan.scour.tide}",
        SIDES_TEXT,
        f"scatter of ln(growth factor) before soundings {plan.soundings.prior_scatter:g}, of growth from one to the "
        f"next {plan.soundings.growth_scatter:g} of that growth; depths in m below the original bed",
    )
    blocks = [
        "\n".join(wrapped(line) for line in head),
        *(_place(each) for each in results.places),
        _programme(results),
        "lines for the plan:\n\n" + plan_lines(results).rstrip(),
    ]
    return "\n\n".join(block for block in blocks if block)


def _place(each: SoundedPlace) -> str:
    from tidescour.handoff.soundings_tables import plan_factor
    from tidescour.units import utc_text

    low, _, high = each.growth_factor
    lines = [wrapped(f"{each.place.opening}, {each.place.side} side")]
    if each.soundings:
        rows = [
            (utc_text(round(sounding.time_s))[:10], *(f"{depth:.2f}" for depth in depths))
            for sounding, *depths in zip(
                each.soundings,
                (sounding.depth_m for sounding in each.soundings),
                (sounding.standard_error_m for sounding in each.soundings),
                each.as_planned_m,
                each.with_factor_m,
                strict=True,
            )
        ]
        own = each.place.growth_factor
        law = "law" if own == 1.0 else f"law x {own:.3g}"
        lines.append(text_table(("sounded on", "depth", "error", law, "with factor"), rows))
    known = f"growth factor {plan_factor(each):.3g}, 90 % from {low:.3g} to {high:.3g}"
    before = f" (before soundings {each.prior_factor[0]:.3g} to {each.prior_factor[2]:.3g})"
    lines.append(wrapped(known + (before if each.soundings else ": not sounded")))
    lines.append(wrapped(_end(each)))
    lines += [wrapped(_stop(stop)) for stop in each.stops]
    return "\n".join(lines)


def _end(each: SoundedPlace) -> str:
    low, middle, high = each.forecast.band.depth_m[:, -1]
    text = f"depth at the end {middle:.2f} m, 90 % from {low:.2f} to {high:.2f}"
    own = each.place.growth_factor
    by_law = "by the law alone" if own == 1.0 else f"by the law with the plan's growth_factor {own:.3g}"
    planned = f"{by_law} {each.forecast.as_planned_m[-1]:.2f}"
    if not each.soundings:
        return f"{text}; {planned}"
    restarts = (
        f"restart from the last sounding with the factor {each.forecast.restart_m[-1]:.2f}, "
        f"unscaled {each.forecast.restart_unscaled_m[-1]:.2f}"
    )
    ratio = each.forecast.plain_ratio_m[-1]
    plain = "" if ratio != ratio else f", plain ratio {ratio:.2f}"
    return f"{text}; {planned}; {restarts}{plain}"


def _stop(stop: StopDate) -> str:
    from tidescour.study.stops import stop_subject
    from tidescour.units import utc_text

    def day(time_s: float) -> str:
        return utc_text(round(time_s))[:10]

    if stop.state == "reached":
        return f"REACHED by {day(stop.reached_s)}: {stop_subject(stop)}"
    if stop.state == "expected":
        return f"expected {day(stop.median_s)}, 5 % by {day(stop.early_s)}: {stop_subject(stop)}"
    if stop.state == "possible":
        return f"possible, 5 % by {day(stop.early_s)}: {stop_subject(stop)}"
    if stop.state == "not reached when last sounded":
        last = f"1 in {stop.sounded_slope_cot:.3g} on {day(stop.sounded_s)}"
        return f"{stop.state}, {last}; slopes are not forecast: {stop_subject(stop)}"
    return f"{stop.state}{' within the programme' if stop.criterion != 'slope' else ''}: {stop_subject(stop)}"


def _programme(results: SoundingResults) -> str:
    """Return planned and computed dates of the stages: ends, and starts where one stands alone."""
    from tidescour.handoff.soundings_tables import programme_table
    from tidescour.units import utc_text

    def cell(time_s: float) -> str:
        return "-" if time_s != time_s else utc_text(round(time_s))[:10]

    table = programme_table(results)

    def dates(which: str) -> str:
        names = ("stage", f"planned_{which}", which, f"{which}_days_late", "sea")
        rows = [
            (name, cell(plan), cell(computed), "-" if days != days else f"{days:.1f}", sea)
            for name, plan, computed, days, sea in zip(*(table.column(name) for name in names), strict=True)
        ]
        return text_table(("stage", f"planned {which}", which, "days late", "sea"), rows)

    stages = results.plan.stage
    ends = any(stage.planned_end is not None for stage in stages)
    starts = any(stage.planned_start is not None and stage.planned_end is None for stage in stages)
    return "\n\n".join([*([dates("start")] if starts else []), *([dates("end")] if ends else [])])
