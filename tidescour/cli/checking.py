"""`tidescour check` and `tidescour tides`: the records and their tides, without a run."""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import TYPE_CHECKING

import click

from tidescour.cli.options import json_option, out_option, plan_argument, quiet_option
from tidescour.cli.speaking import exit_with, progress, say_findings, text_table, wrapped

if TYPE_CHECKING:
    from tidescour.pipeline import TidalInputs
    from tidescour.plan.models import Plan
    from tidescour.tide.records import TideFit

FLAG_NAMES = {"pass": 1, "not_evaluated": 2, "suspect": 3, "fail": 4, "missing": 9}


@click.command(short_help="Read and check the gauge records.")
@plan_argument
@out_option
@json_option
@quiet_option
def check(plan: Path, out: Path | None, as_json: bool, quiet: bool) -> int:
    """Read the gauge records of PLAN and say what is wrong with them.

    Writes records.csv and findings.csv with --out.

    \b
    Example:
      tidescour check mysite/plan.toml
    """
    from tidescour.handoff.files import check_files
    from tidescour.handoff.results_tables import findings_table
    from tidescour.handoff.tables import row_objects

    read, inputs = _read(plan, out, "check", quiet)
    if out is not None:
        _write(out, check_files(inputs.records, inputs.findings), "check", read, inputs)
    say_findings(inputs.findings, quiet or as_json)
    if as_json:
        document = {"records": _record_counts(inputs), "findings": row_objects(findings_table(inputs.findings))}
        click.echo(json.dumps(document, indent=2, ensure_ascii=False))
    else:
        click.echo(_records_text(inputs))
    return exit_with(inputs.findings)


@click.command(short_help="Fit the tides and print constants.")
@plan_argument
@out_option
@json_option
@quiet_option
def tides(plan: Path, out: Path | None, as_json: bool, quiet: bool) -> int:
    """Fit the tides of PLAN and print their constants.

    Writes records.csv, tides.csv and findings.csv with --out.

    \b
    Example:
      tidescour tides mysite/plan.toml --out mysite/tides
    """
    from tidescour.errors import PlanError
    from tidescour.handoff.files import tides_files
    from tidescour.handoff.results_tables import findings_table, tides_table
    from tidescour.handoff.tables import row_objects

    read, inputs = _read(plan, out, "tides", quiet)
    if not inputs.fits:
        raise next(iter(inputs.refused.values()), PlanError("the plan names no gauge record and no tide.sea_constants"))
    if out is not None:
        _write(out, tides_files(inputs.records, inputs.fits, inputs.findings), "tides", read, inputs)
    say_findings(inputs.findings, quiet or as_json)
    if as_json:
        tables = {"tides": tides_table(inputs.fits), "findings": findings_table(inputs.findings)}
        document = {name: row_objects(table) for name, table in tables.items()}
        click.echo(json.dumps({"records": _record_counts(inputs), **document}, indent=2, ensure_ascii=False))
    else:
        click.echo("\n\n".join([_records_text(inputs), *(_fit_text(fit) for fit in inputs.fits)]))
    return exit_with(inputs.findings)


def _read(plan_file: Path, out: Path | None, command: str, quiet: bool) -> tuple[Plan, TidalInputs]:
    from tidescour.handoff.write import check_replaceable
    from tidescour.pipeline import plan_choices, tidal_inputs
    from tidescour.plan.loader import read_plan

    read = read_plan(plan_file, plan_choices(), purpose="records")
    if out is not None:
        check_replaceable(out, command)
    with progress(quiet) as show:
        return read, tidal_inputs(read, show)


def _write(out: Path, files: dict[str, bytes], command: str, plan: Plan, inputs: TidalInputs) -> None:
    from tidescour.handoff.provenance import circumstances, provenance_block
    from tidescour.handoff.write import write_results
    from tidescour.plan.resolved import resolved_plan

    block = provenance_block(plan.file, inputs.files, resolved_plan(plan))
    write_results(out, files, command, {**block, **circumstances(sys.argv)})


def _record_counts(inputs: TidalInputs) -> list[dict[str, object]]:
    """Return what was read of each gauge: span, step and how many rows have which flag."""
    from tidescour.units import utc_text

    return [
        {
            "side": record.side,
            "start": utc_text(record.time_s[0]),
            "end": utc_text(record.time_s[-1]),
            "step_s": record.step_s,
            "rows": int(record.flag.size),
            **{name: int((record.flag == flag).sum()) for name, flag in FLAG_NAMES.items()},
        }
        for record in inputs.records
    ]


def _records_text(inputs: TidalInputs) -> str:
    counts = _record_counts(inputs)
    if not counts:
        return "no gauge records in the plan"
    header = ("gauge", "rows", *(name.replace("_", " ") for name in FLAG_NAMES))
    rows = [(str(each["side"]), *(str(each[name]) for name in ("rows", *FLAG_NAMES))) for each in counts]
    spans = [
        f"{each['side']}: {each['start']} to {each['end']}, step {float(str(each['step_s'])) / 60.0:g} min"
        for each in counts
    ]
    return "\n".join([text_table(header, rows), *(wrapped(span) for span in spans)])


def _fit_text(fit: TideFit) -> str:
    constants = fit.constants
    rows = [
        (name, f"{amplitude:.4f}", f"{phase:.2f}")
        for name, amplitude, phase in sorted(
            zip(constants.constituents, constants.amplitude_m, constants.phase_deg, strict=True),
            key=lambda row: -row[1],
        )
    ]
    head = f"{fit.side} tide: mean {constants.mean_m:.3f} m, {fit.choice}"
    if fit.samples:
        head += (
            f"\n{fit.samples} samples, {100.0 * fit.explained_share:.2f} % of the variance explained, residual "
            f"{fit.residual_std_m:.3f} m (standard deviation)"
        )
    return f"{wrapped(head)}\n{text_table(('constituent', 'amplitude m', 'phase deg'), rows)}"
