"""`tidescour run`: the whole job."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING

import click

from tidescour.cli.options import json_option, out_option, plan_argument, quiet_option
from tidescour.cli.speaking import exit_with, progress, say_findings, text_table, wrapped

if TYPE_CHECKING:
    from tidescour.handoff.records import PlaceResult, RunResults
    from tidescour.scour.records import Rule

MOST_CHANGES = 3
"""Inputs named for each place, those that change the required length most."""


@click.command(short_help="Do the whole job.")
@plan_argument
@out_option
@click.option("--no-figures", is_flag=True, help="Leave the pictures out, which is faster.")
@json_option
@quiet_option
def run(plan: Path, out: Path | None, no_figures: bool, as_json: bool, quiet: bool) -> int:
    """Do the whole job of PLAN: records, tides, velocities, durations, scour and length of protection.

    Results go to DIR, or to `<plan stem>_results` beside the plan.

    \b
    Examples:
      tidescour run mysite/plan.toml
      tidescour run mysite/plan.toml --out results --quiet
    """
    from tidescour import pipeline
    from tidescour.handoff.files import run_files
    from tidescour.handoff.provenance import circumstances, provenance_block
    from tidescour.handoff.write import check_replaceable, write_results
    from tidescour.plan.loader import read_plan
    from tidescour.plan.resolved import resolved_plan

    begun = circumstances(sys.argv)
    checked = read_plan(plan, pipeline.plan_choices(), purpose="run")
    folder = plan.with_name(f"{plan.stem}_results") if out is None else out
    check_replaceable(folder, "run")
    with progress(quiet) as show:
        results = pipeline.run(checked, show)
        block = provenance_block(checked.file, results.files, resolved_plan(checked))
        files = run_files(results, block)
        if not no_figures:
            from tidescour.report.pictures import picture_files, pictures

            show("drawing the figures")
            files |= picture_files(pictures(results))
        show("writing the results")
        write_results(folder, files, "run", {**block, **begun})
    say_findings(results.findings, quiet or as_json)
    if not quiet:
        click.echo(f"results in {folder}", err=True)
    click.echo(files["handoff.json"].decode("utf-8") if as_json else _results_text(results))
    return exit_with(results.findings)


def _results_text(results: RunResults) -> str:
    from tidescour.handoff.conventions import SIDES_TEXT

    head = (
        results.plan.site.name,
        f"law {results.law.name}: {results.law.text}; growth driven by {results.plan.scour.tide}",
        SIDES_TEXT,
        "Effective hours count at each row's own reference velocity u_ref. Peak and mean: that velocity held all the "
        "time with flow. Alpha needed: by each rule for the depth of the integral, in the stage with the largest "
        "share.",
    )
    cautions = [finding.message for finding in results.findings if finding.code == "tide-only"]
    return "\n\n".join(
        [
            "\n".join(wrapped(line) for line in (*head, *cautions)),
            *(_place_text(results, place) for place in results.places),
            *_stone_text(results),
        ]
    )


def _place_text(results: RunResults, place: PlaceResult) -> str:
    driving = results.plan.scour.tide
    return "\n".join(
        [
            wrapped(f"{place.place.opening}, {place.place.side} side"),
            _stages_text(place, driving),
            _rules_text(place, driving),
            wrapped(_length_text(place)),
            *(wrapped(line) for line in _storms_text(results, place)),
            *(wrapped(line) for line in _changes_text(place)),
        ]
    )


def _stages_text(place: PlaceResult, driving: Rule) -> str:
    from tidescour.plan.kinds import TIDE_RULES

    header = ("stage", "u_ref m/s", "integral h", "flow m. h", "cycle m. h", "depth m", "share %")
    rows = [
        (
            row.stage.name,
            _number(row.duration.reference_velocity_m_s, 2),
            *(_number(row.duration.total_h(rule), 1) for rule in TIDE_RULES),
            _number(row.step(driving).end_depth_m, 2),
            _number(100.0 * row.step(driving).share, 0),
        )
        for row in place.rows
    ]
    return text_table(header, rows)


def _rules_text(place: PlaceResult, driving: Rule) -> str:
    """Return final depth and alpha needed under every rule."""
    from tidescour.handoff.design_tables import row_of_largest_share
    from tidescour.handoff.results_tables import final_depth_m
    from tidescour.scour.records import RULES

    header = ("rule", "integral", "flow m.", "cycle m.", "peak", "mean")
    rows = [("final depth m", *(_number(final_depth_m(place, rule), 2) for rule in RULES))]
    main = row_of_largest_share(place, driving)
    if main is not None:
        rows.append(("alpha needed", *(_number(alpha, 2) for alpha in main.equal_alpha)))
    return text_table(header, rows)


def _length_text(place: PlaceResult) -> str:
    from tidescour.units import utc_text

    bed, required = place.place, place.required
    margin = f", margin {bed.depth_margin_factor:g}" if bed.depth_margin_factor != 1.0 else ""
    single = required.single_slide_m
    under = f", under the least length of {required.minimum_m:.1f} m" if single < required.minimum_m else ""
    slide = f" ({single:.1f} m by a single slide{under})" if single == single else ""
    reached = place.length_reached_s
    when = f"; too short from {utc_text(reached)[:10]} on" if reached == reached else ""
    return (
        f"length given {bed.length_m:.1f} m{when}; required {required.length_m:.1f} m at a slope of 1 in "
        f"{bed.failure_slope_cot:g}{margin}{slide}"
    )


def _storms_text(results: RunResults, place: PlaceResult) -> list[str]:
    return [
        f"{row.load_case} after {row.stage!r}: depth {row.depth_before_m:.2f} to {row.depth_after_m:.2f} m, at the end "
        f"{row.final_depth_m:.2f} m; {row.peak_gap_velocity_m_s:.2f} m/s in the gap"
        for row in results.load_cases.rows
        if (row.opening, row.side) == (place.place.opening, place.place.side)
    ]


def _stone_text(results: RunResults) -> list[str]:
    """Return the fastest water on stone in one line; nothing where no load is known."""
    from tidescour.units import utc_text

    loads = [size.load for size in results.stone.sizes]
    if not loads:
        return []
    worst = max(loads, key=lambda load: load.velocity_m_s)
    line = (
        f"stone, screening only: up to {worst.velocity_m_s:.2f} m/s at {worst.opening}, {worst.location}, in stage "
        f"{worst.stage!r} on {utc_text(worst.time_s)[:10]}; sizes by four forms are in stone.csv"
    )
    return [wrapped(line)]


def _changes_text(place: PlaceResult) -> list[str]:
    from tidescour.handoff.design_tables import largest_changes

    return [
        f"{each.change}: depth {each.depth_change_m:+.2f} m, length {each.length_change_m:+.1f} m"
        for each in largest_changes(place, MOST_CHANGES)
    ]


def _number(value: float, digits: int) -> str:
    return "-" if value != value else f"{value:.{digits}f}"
