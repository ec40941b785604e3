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
        "Effective hours count at each row's own reference velocity u_ref.",
    )
    return "\n\n".join(
        ["\n".join(wrapped(line) for line in head), *(_place_text(results, place) for place in results.places)]
    )


def _place_text(results: RunResults, place: PlaceResult) -> str:
    from tidescour.handoff.results_tables import effective_duration_h
    from tidescour.plan.models import TIDE_RULES

    driving = TIDE_RULES.index(results.plan.scour.tide)
    rows = [
        (
            row.stage.name,
            _number(row.duration.reference_velocity_m_s, 2),
            *(_number(effective_duration_h(row, rule), 1) for rule in TIDE_RULES),
            _number(row.chain[driving].end_depth_m, 2),
            _number(100.0 * row.chain[driving].share, 0),
        )
        for row in place.rows
    ]
    header = ("stage", "u_ref m/s", "integral h", "flow m. h", "cycle m. h", "depth m", "share %")
    final = [row.end_depth_m for row in place.rows[-1].chain]
    depths = f"final depth {final[0]:.2f} / {final[1]:.2f} / {final[2]:.2f} m (integral / flow mean / cycle mean)"
    length = (
        f"length given {place.place.length_m:.1f} m, required {place.required.length_m:.1f} m "
        f"at a slope of 1 in {place.place.failure_slope_cot:g}"
    )
    title = f"{place.place.opening}, {place.place.side} side"
    return "\n".join([wrapped(title), text_table(header, rows), wrapped(depths), wrapped(length)])


def _number(value: float, digits: int) -> str:
    return "-" if value != value else f"{value:.{digits}f}"
