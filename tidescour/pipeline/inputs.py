"""Records read and checked, tides fitted: what every command starts from."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass

from tidescour.errors import Finding, FitError
from tidescour.gauge.checks import check_record
from tidescour.gauge.pair import check_pair
from tidescour.gauge.read import read_gauge
from tidescour.gauge.records import GaugeRecord, InputFile
from tidescour.plan.constants import ConstantsTable, read_constants
from tidescour.plan.hashes import path_for_results, plan_hashes
from tidescour.plan.kinds import SIDES, Side
from tidescour.plan.models import Plan, Tide
from tidescour.tide.fit import MANY_SAMPLES, SCREENING_SAMPLES, fit_from_table, fit_pair, fit_record
from tidescour.tide.library import constituent_names
from tidescour.tide.pair import compare_fits
from tidescour.tide.predict import predicted_level
from tidescour.tide.records import TideFit

Progress = Callable[[str], None]


def silent(step: str) -> None:
    """Take the name of a step that begins, and do nothing."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class TidalInputs:
    """Records and tides of a plan, checked: what `check` and `tides` print and a run starts from.

    `fits` holds the tides that could be fitted or were given; `refused` why a side has none.
    """

    records: tuple[GaugeRecord, ...]
    fits: tuple[TideFit, ...]
    refused: Mapping[Side, FitError]
    files: tuple[InputFile, ...]
    findings: tuple[Finding, ...]

    def record(self, side: Side) -> GaugeRecord | None:
        """Return the gauge of one side."""
        return next((record for record in self.records if record.side == side), None)

    def fit(self, side: Side) -> TideFit | None:
        """Return the tide of one side."""
        return next((fit for fit in self.fits if fit.side == side), None)


def tidal_inputs(plan: Plan, progress: Progress = silent) -> TidalInputs:
    """Read the gauges of a plan, fit their tides, check them against these, and fit again without what failed.

    Raises
    ------
    RecordError, PlanError
        If a file cannot be read, or the two records cannot be those of sea and basin.
    """
    progress("reading the records")
    sources = {"sea": plan.records.sea, "basin": plan.records.basin}
    raw = [
        read_gauge(source, side, plan.correction, plan.folder)
        for side in SIDES
        if (source := sources[side]) is not None
    ]
    pair_findings = check_pair(*raw) if len(raw) == 2 else ()
    progress("fitting the tides")
    # What is inferred serves other seasons; inside the record the fit is as good without.
    first, _ = _own_fits(plan, raw, plan.tide.model_copy(update={"infer": {}}), SCREENING_SAMPLES)
    progress("checking the records against the tides")
    records = tuple(
        check_record(record, predicted_level(first[record.side].constants, record.time_s))
        if record.side in first
        else check_record(record, None)
        for record in raw
    )
    progress("fitting the tides without what failed")
    fits, refused = _final_fits(plan, records)
    table = _sea_table(plan)
    # The plan itself stands apart from the files that it names.
    files = [InputFile(path=name, sha256=sha256) for name, sha256 in plan_hashes(plan)[1:]]
    files += [file for record in records for file in record.files]
    if table is not None:
        fits["sea"] = fit_from_table(
            table.constituents, table.amplitude_m, table.phase_deg, plan.tide.sea_mean_m or 0.0, plan.site.latitude_deg
        )
        refused.pop("sea", None)
        files.append(InputFile(path=path_for_results(str(plan.tide.sea_constants)), sha256=table.sha256))
    compared = compare_fits(fits["sea"], fits["basin"]) if fits.keys() == {"sea", "basin"} else ()
    unfitted = [
        Finding(
            severity="warning",
            code="no-tide",
            where=f"records.{side}",
            message=f"no tide is fitted, so that checks against the tide were not evaluated: {error}",
        )
        for side, error in refused.items()
    ]
    return TidalInputs(
        records=records,
        fits=tuple(fits[side] for side in SIDES if side in fits),
        refused=refused,
        files=tuple(files),
        findings=together(
            (record.findings for record in records),
            [pair_findings, unfitted],
            (fit.findings for fit in fits.values()),
            [compared],
        ),
    )


def refuse_missing_tides(plan: Plan, inputs: TidalInputs) -> None:
    """Refuse a plan with a stage on the tide of a side that has none, with the reason why it has none.

    Raises
    ------
    FitError
        As the fit was refused.
    """
    for side, error in inputs.refused.items():
        if any(stage.sea == "tide" if side == "sea" else stage.basin == "tide" for stage in plan.stage):
            raise error


def together(*groups: Iterable[Iterable[Finding]]) -> tuple[Finding, ...]:
    """Return findings in order, each once."""
    return tuple(dict.fromkeys(finding for group in groups for findings in group for finding in findings))


def _sea_table(plan: Plan) -> ConstantsTable | None:
    if plan.tide.sea_constants is None:
        return None
    return read_constants(plan.folder / plan.tide.sea_constants, constituent_names())


def _own_fits(
    plan: Plan, records: Iterable[GaugeRecord], options: Tide, many_samples: int = MANY_SAMPLES
) -> tuple[dict[Side, TideFit], dict[Side, FitError]]:
    fits: dict[Side, TideFit] = {}
    refused: dict[Side, FitError] = {}
    for record in records:
        try:
            fits[record.side] = fit_record(record, options, plan.site.latitude_deg, many_samples)
        except FitError as error:
            refused[record.side] = error
    return fits, refused


def _final_fits(plan: Plan, records: tuple[GaugeRecord, ...]) -> tuple[dict[Side, TideFit], dict[Side, FitError]]:
    in_pairs = plan.tide.sea_constants is None and any(stage.basin == "tide" for stage in plan.stage)
    if len(records) == 2 and in_pairs:
        try:
            sea, basin = fit_pair(records[0], records[1], plan.tide, plan.site.latitude_deg)
        except FitError as error:
            return {}, {"sea": error, "basin": error}
        return {"sea": sea, "basin": basin}, {}
    return _own_fits(plan, records, plan.tide)
