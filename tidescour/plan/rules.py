"""All rules of a plan that need more than one key; each returns what is wrong, and judges only sound keys."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from tidescour.plan import rules_basin as basin
from tidescour.plan import rules_bed as bed
from tidescour.plan import rules_inputs as inputs
from tidescour.plan import rules_openings as openings
from tidescour.plan import rules_stages as stages
from tidescour.plan import rules_survey as survey
from tidescour.plan.draft import Draft
from tidescour.plan.problems import Problem

Rule = Callable[[Draft], Iterator[Problem]]

RULES: tuple[Rule, ...] = (
    inputs.something_to_read,
    inputs.one_clock,
    inputs.means_have_a_length,
    inputs.ranges_run_upwards,
    inputs.corrections_correct_something,
    inputs.series_fit_their_quantity,
    inputs.series_have_own_names,
    inputs.constituents_are_known,
    inputs.inferred_constituents_have_a_reference,
    inputs.one_source_of_the_sea_tide,
    basin.storage_has_one_source,
    basin.basin_grows_with_its_level,
    basin.inflows_have_one_source,
    inputs.bed_is_graded,
    bed.layers_lie_under_each_other,
    bed.cohesion_has_its_evidence,
    bed.growth_laws_have_their_numbers,
    bed.filters_are_graded,
    stages.a_run_has_stages,
    stages.stages_follow_each_other,
    stages.planned_dates_run_forwards,
    openings.openings_have_own_names,
    openings.openings_have_one_shape,
    openings.profiles_are_open,
    stages.levels_go_together,
    stages.levels_have_a_source,
    openings.flow_has_one_source,
    openings.given_flow_is_known,
    stages.places_exist,
    stages.protection_is_complete,
    bed.alpha_has_one_source,
    bed.spreading_has_its_rate,
    bed.stop_slopes_have_a_height,
    stages.grain_size_is_given,
    basin.a_calibration_has_its_records,
    basin.calibration_has_something_to_find,
    basin.discharges_belong_to_the_calibration,
    survey.soundings_are_there,
    survey.soundings_belong_to_places,
    survey.soundings_have_one_depth,
    survey.soundings_lie_in_the_programme,
    survey.load_cases_follow_stages,
)


def rule_problems(draft: Draft) -> list[Problem]:
    """Return everything that the rules find wrong."""
    return [problem for rule in RULES for problem in rule(draft)]
