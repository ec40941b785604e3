"""`tidescour delay`: what each stage costs by being late."""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import TYPE_CHECKING

import click

from tidescour.cli.options import json_option, out_option, plan_argument, quiet_option
from tidescour.cli.speaking import exit_with, progress, say_findings, text_table, wrapped

if TYPE_CHECKING:
    from tidescour.study.delay import DelayStudy, StageCost


@click.command(short_help="What a stage costs by being late.")
@plan_argument
@click.option(
    "--weeks",
    type=click.IntRange(1, 26),
    default=8,
    show_default=True,
    metavar="N",
    help="Longest delay; every week up to it is computed.",
)
@out_option
@click.option("--no-figures", is_flag=True, help="Leave the pictures out, which is faster.")
@json_option
@quiet_option
def delay(plan: Path, weeks: int, out: Path | None, no_figures: bool, as_json: bool, quiet: bool) -> int:
    """Let each stage of PLAN be late, one after the other, and compute depths and required lengths anew.

    A late stage ends later, and what moves in it moves slower. Two numbers tell what that adds: by the longer stay in
    that stage alone, all others growing as planned, and with every later stage moved to the tides of its new dates.
    With --out writes delay.csv, findings.csv and the pictures.

    \b
    Example:
      tidescour delay mysite/plan.toml --weeks 4 --out mysite/delay
    """
    from tidescour.handoff.delay_tables import delay_files, delay_table
    from tidescour.handoff.provenance import circumstances, provenance_block
    from tidescour.handoff.results_tables import findings_table
    from tidescour.handoff.tables import row_objects
    from tidescour.handoff.write import check_replaceable, write_results
    from tidescour.pipeline.choices import plan_choices
    from tidescour.pipeline.delaying import delay as delay_study
    from tidescour.plan.loader import read_plan
    from tidescour.plan.resolved import resolved_plan

    begun = circumstances(sys.argv)
    checked = read_plan(plan, plan_choices(), purpose="run")
    if out is not None:
        check_replaceable(out, "delay")
    with progress(quiet) as show:
        study = delay_study(checked, range(1, weeks + 1), show)
        if out is not None:
            files = delay_files(study)
            if not no_figures:
                from tidescour.report.figures_delay import delay_pictures
                from tidescour.report.pictures import picture_files

                show("drawing the figures")
                files |= picture_files(delay_pictures(study))
            block = provenance_block(checked.file, study.files, resolved_plan(checked))
            write_results(out, files, "delay", {**block, **begun})
    say_findings(study.findings, quiet or as_json)
    if out is not None and not quiet:
        click.echo(f"results in {out}", err=True)
    if as_json:
        tables = (delay_table(study), findings_table(study.findings))
        click.echo(json.dumps({table.name: row_objects(table) for table in tables}, indent=2, ensure_ascii=False))
    else:
        click.echo(_text(study))
    return exit_with(study.findings)


def _text(study: DelayStudy) -> str:
    from tidescour.handoff.conventions import SIDES_TEXT
    from tidescour.study.delay import stage_costs

    costs = stage_costs(study)
    head = "\n".join(wrapped(line) for line in (study.plan.site.name, SIDES_TEXT))
    if not costs:
        return f"{head}\n\n{wrapped('No stage has a result for being late; the findings say why.')}"
    return "\n\n".join([head, _table(study, costs), _advice(costs)])


def _table(study: DelayStudy, costs: tuple[StageCost, ...]) -> str:
    from tidescour.study.delay import per_week

    fewest, most = study.weeks[0], study.weeks[-1]
    several = fewest != most
    title = (
        "metres more per week that a stage is late, at the place that its longer stay deepens most: by its own longer "
        f"stay over {f'{fewest} and ' if several else ''}{_weeks(most)}, and over {_weeks(most)} with later stages "
        "moved too"
    )
    rows = [
        (
            cost.stage,
            f"{cost.most.opening}, {cost.most.side}",
            *([_number(per_week(cost.fewest.own_stay.depth_m, cost.fewest))] if several else []),
            _number(per_week(cost.most.own_stay.depth_m, cost.most)),
            _number(per_week(cost.most.calendar.depth_m, cost.most)),
            _number(per_week(cost.most.own_stay.length_m, cost.most)),
        )
        for cost in costs
    ]
    first = (f"depth {fewest} wk",) if several else ()
    header = ("stage", "worst place", *first, f"depth {most} wk", "moved", f"length {most} wk")
    return "\n".join([wrapped(title), text_table(header, rows)])


def _advice(costs: tuple[StageCost, ...]) -> str:
    from tidescour.study.delay import first_to_shorten, per_week

    first = first_to_shorten(costs)
    if first is None:
        return wrapped("No stage deepens any hole by lasting longer.")
    row = first.most
    return wrapped(
        f"Shorten {first.stage!r} first: for {_weeks(row.weeks_late)} more of it the hole at {row.opening}, {row.side} "
        f"side, is {row.own_stay.depth_m:.2f} m deeper, {per_week(row.own_stay.depth_m, row):.2f} m a week, and the "
        f"protection there must be {row.own_stay.length_m:.1f} m longer."
    )


def _weeks(count: int) -> str:
    return f"{count} week{'s' if count != 1 else ''}"


def _number(value: float) -> str:
    return "-" if value != value else f"{value:z.3f}"
