"""A calibration of the basin: records and tides as for a run, then the estimate."""

from __future__ import annotations

from tidescour.errors import PlanError
from tidescour.gap.calibrating import calibrate_basin
from tidescour.handoff.records import CalibrationResults
from tidescour.pipeline.inputs import Progress, silent, tidal_inputs, together
from tidescour.pipeline.preparing import given_series, waters_of
from tidescour.plan.models import Plan


def calibrate(plan: Plan, progress: Progress = silent) -> CalibrationResults:
    """Estimate coefficient, storage and datum of a plan's basin from its records.

    Raises
    ------
    TidescourError
        If anything in the plan or its records does not allow it, or the records cannot tell; nothing was written.
    """
    inputs = tidal_inputs(plan, progress)
    record = inputs.record("basin")
    if plan.calibration is None or plan.basin is None or record is None:
        raise PlanError("a calibration needs [calibration], [basin] and both records in the plan")
    series = given_series(plan)
    # The tides serve to check the records and to bridge holes: what qualifies their constants is not told here.
    of_constants = {finding for fit in inputs.fits for finding in fit.findings}
    read = [finding for finding in inputs.findings if finding not in of_constants]
    progress("routing the recorded sea level and fitting the basin")
    found = calibrate_basin(plan.calibration, plan.basin, waters_of(plan, inputs, series), record, plan.discharge)
    return CalibrationResults(
        plan=plan,
        calibrated=found,
        files=(*inputs.files, *(each.file for each in series.values())),
        findings=together([read], (each.findings for each in series.values()), [found.findings]),
    )
