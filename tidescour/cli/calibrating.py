"""`tidescour calibrate`: coefficient, storage and datum of the basin from both gauges."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from tidescour.cli.options import json_option, out_option, plan_argument, quiet_option
from tidescour.cli.speaking import text_table, wrapped
from tidescour.cli.studying import Study, run_study

if TYPE_CHECKING:
    from tidescour.gap.campaigns import CampaignTable
    from tidescour.gap.discharges import CampaignComparison, TidalDischarge
    from tidescour.handoff.records import CalibrationResults
    from tidescour.report.pictures import Picture


@click.command(short_help="Fit the basin to both gauges.")
@plan_argument
@out_option
@click.option("--no-figures", is_flag=True, help="Leave the pictures out, which is faster.")
@json_option
@quiet_option
def calibrate(plan: Path, out: Path | None, no_figures: bool, as_json: bool, quiet: bool) -> int:
    """Estimate the basin of PLAN from the records of both gauges, and from measured discharges where there are any.

    The recorded sea level is routed through the gap as it was then, by [calibration] of the plan, and coefficient,
    storage and datum are fitted to the recorded basin level. A part at the end is held back and predicted. Prints the
    lines to put in the place of the plan's own; with --out writes calibration.csv and what stands behind it.

    \b
    Example:
      tidescour calibrate mysite/plan.toml --out mysite/calibration
    """
    from tidescour import pipeline

    study = Study(
        command="calibrate",
        purpose="calibrate",
        compute=pipeline.calibrate,
        files=_files,
        pictures=_pictures,
        document=_document,
        text=_text,
    )
    return run_study(study, plan, out, no_figures=no_figures, as_json=as_json, quiet=quiet)


def _files(results: CalibrationResults) -> dict[str, bytes]:
    from tidescour.handoff.calibration_tables import plan_lines
    from tidescour.handoff.files import calibration_files

    lines = plan_lines(results.plan, results.calibrated).encode("utf-8")
    return calibration_files(results) | {"plan_lines.toml": lines}


def _pictures(results: CalibrationResults) -> tuple[Picture, ...]:
    from tidescour.report.pictures import calibration_pictures

    return calibration_pictures(results)


def _document(results: CalibrationResults) -> dict[str, object]:
    from tidescour.handoff.calibration_tables import campaigns_table, estimates_table, plan_lines, scores_table
    from tidescour.handoff.results_tables import findings_table
    from tidescour.handoff.tables import row_objects

    found = results.calibrated
    tables = (
        estimates_table(found),
        scores_table(found),
        campaigns_table(found),
        findings_table(results.findings),
    )
    return {**{table.name: row_objects(table) for table in tables}, "plan_lines": plan_lines(results.plan, found)}


def _text(results: CalibrationResults) -> str:
    from tidescour.handoff.calibration_tables import plan_lines

    found = results.calibrated
    estimate = found.estimate
    noise = (
        f"levels: {estimate.level_count} used, what is left {100.0 * estimate.residual_std_m:.1f} cm (standard "
        f"deviation) with a correlation time of {estimate.residual_correlation_time_h:.1f} h, worth "
        f"{estimate.effective_count:.0f} independent ones; measured discharges: {estimate.discharge_count}"
    )
    blocks = [
        "\n".join([wrapped(results.plan.site.name), wrapped(noise)]),
        _estimates(results),
        _scores(results),
        *(_campaign(table) for table in found.campaigns if table.comparisons),
        "lines for the plan:\n\n" + plan_lines(results.plan, found).rstrip(),
    ]
    return "\n\n".join(block for block in blocks if block)


def _estimates(results: CalibrationResults) -> str:
    from tidescour.handoff.calibration_tables import estimates_table

    estimate = results.calibrated.estimate
    names = [name.replace("_", " ") for name in estimate.names]
    rows = [
        (_label(name), *(_number(value, 4) for value in numbers), known)
        for name, *numbers, known in zip(*estimates_table(results.calibrated).values, strict=True)
    ]
    lines = [text_table(("parameter", "estimate", "95 % from", "to", "of use"), rows)]
    lines += [
        wrapped(f"correlation of {names[other]} and {names[one]}: {estimate.correlation[other, one]:.2f}")
        for one in range(len(names))
        for other in range(one)
    ]
    return "\n".join(lines)


def _label(name: str) -> str:
    """Return a parameter's name, in words short enough for a narrow terminal."""
    return "coefficient / area" if name == "coefficient_over_area_factor" else name.replace("_", " ")


def _scores(results: CalibrationResults) -> str:
    rows = [
        (
            f"{part.name}, {method}",
            _tenths(100.0 * score.rms_m),
            _tenths(100.0 * score.bias_m),
            _tenths(100.0 * score.range_error_m),
            _tenths(score.phase_error_s / 60.0),
        )
        for part in results.calibrated.parts
        for method, score in (("routed", part.routed), ("lagged sea", part.guess))
    ]
    return text_table(("basin level", "rms cm", "bias cm", "range cm", "late min"), rows)


def _slack(row: TidalDischarge, comparison: CampaignComparison) -> str:
    """Return the time of a row's slack nearest to the first measured one, hour and minute."""
    from tidescour.units import utc_text

    measured = comparison.rows[0].slack_time_s
    if not (row.slack_time_s.size and measured.size):
        return "-"
    return utc_text(min(row.slack_time_s.tolist(), key=lambda time: abs(time - float(measured[0]))))[11:16]


def _campaign(table: CampaignTable) -> str:
    from tidescour.units import utc_text

    blocks = []
    for comparison in table.comparisons:
        kind = "campaign" if table.measured else "no campaign, whole span"
        title = (
            f"discharge, {table.opening or 'all openings'} ({kind}): {utc_text(comparison.start_s)} to "
            f"{utc_text(comparison.end_s)}"
        )
        rows = [
            (
                row.source,
                _number(row.flood_volume_m3 / 1e6, 4),
                _number(row.ebb_volume_m3 / 1e6, 4),
                _number(row.flood_peak_m3_s, 4),
                _number(row.ebb_peak_m3_s, 4),
                _slack(row, comparison),
            )
            for row in comparison.rows
        ]
        header = ("source", "flood Mm3", "ebb Mm3", "flood m3/s", "ebb m3/s", "slack UTC")
        shown = len(header) if table.measured else -1
        blocks.append("\n".join([wrapped(title), text_table(header[:shown], [row[:shown] for row in rows])]))
    return "\n\n".join(blocks)


def _tenths(value: float) -> str:
    return "-" if value != value else f"{value:z.1f}"


def _number(value: float, digits: int) -> str:
    return "-" if value != value else f"{value:.{digits}g}"
