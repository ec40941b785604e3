"""`tidescour delay`: what each stage costs by being late."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from tidescour.cli.options import json_option, out_option, plan_argument, quiet_option
from tidescour.cli.speaking import text_table, wrapped
from tidescour.cli.studying import Study, run_study

if TYPE_CHECKING:
    from tidescour.report.pictures import Picture
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
    from tidescour.handoff.delay_tables import delay_files
    from tidescour.pipeline.delaying import delay as delay_study

    study = Study(
        command="delay",
        purpose="delay",
        compute=lambda checked, show: delay_study(checked, range(1, weeks + 1), show),
        files=delay_files,
        pictures=_pictures,
        document=_document,
        text=_text,
    )
    return run_study(study, plan, out, no_figures=no_figures, as_json=as_json, quiet=quiet)


def _pictures(study: DelayStudy) -> tuple[Picture, ...]:
    from tidescour.report.figures_delay import delay_pictures

    return tuple(delay_pictures(study))


def _document(study: DelayStudy) -> dict[str, object]:
    from tidescour.handoff.delay_tables import delay_table
    from tidescour.handoff.results_tables import findings_table
    from tidescour.handoff.tables import row_objects

    return {table.name: row_objects(table) for table in (delay_table(study), findings_table(study.findings))}


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
