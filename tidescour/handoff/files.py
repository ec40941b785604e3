"""The files of a result folder by command, as bytes; figures, page and spreadsheet come beside them."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from tidescour.errors import Finding
from tidescour.gauge.records import GaugeRecord
from tidescour.handoff.calibration_tables import calibration_tables
from tidescour.handoff.design_tables import comparison_table, layers_table, length_curve_table, sensitivity_table
from tidescour.handoff.document import handoff_document
from tidescour.handoff.encode import json_bytes
from tidescour.handoff.load_case_tables import load_cases_table
from tidescour.handoff.methods_table import methods_table
from tidescour.handoff.records import CalibrationResults, RunResults
from tidescour.handoff.results_tables import (
    cycles_table,
    durations_table,
    findings_table,
    growth_table,
    protection_table,
    records_table,
    sweep_table,
    tides_table,
    velocities_table,
)
from tidescour.handoff.stone_tables import filter_table, stone_table
from tidescour.handoff.tables import ResultTable, csv_bytes
from tidescour.tide.records import TideFit


def check_files(records: Iterable[GaugeRecord], findings: Iterable[Finding]) -> dict[str, bytes]:
    """Return the files of a check of the records."""
    return _csv_files(records_table(records), findings_table(findings))


def tides_files(
    records: Iterable[GaugeRecord], fits: Iterable[TideFit], findings: Iterable[Finding]
) -> dict[str, bytes]:
    """Return the files of a fit of the tides."""
    return _csv_files(records_table(records), tides_table(fits), findings_table(findings))


def run_files(results: RunResults, provenance: Mapping[str, object]) -> dict[str, bytes]:
    """Return the hand-off and every CSV file of a run; `provenance` comes from `provenance_block`."""
    tables = _csv_files(
        durations_table(results),
        cycles_table(results),
        velocities_table(results),
        growth_table(results),
        protection_table(results),
        comparison_table(results),
        length_curve_table(results),
        sensitivity_table(results),
        layers_table(results),
        load_cases_table(results.load_cases),
        stone_table(results.stone),
        filter_table(results.filters),
        sweep_table(results.sweep),
        tides_table(results.fits),
        records_table(results.records),
        methods_table(results.methods, results.findings),
        findings_table(results.findings),
    )
    return {"handoff.json": json_bytes(handoff_document(results, provenance)), **tables}


def calibration_files(results: CalibrationResults) -> dict[str, bytes]:
    """Return the files of a calibration."""
    return _csv_files(*calibration_tables(results.calibrated), findings_table(results.findings))


def _csv_files(*tables: ResultTable) -> dict[str, bytes]:
    return {f"{table.name}.csv": csv_bytes(table) for table in tables}
