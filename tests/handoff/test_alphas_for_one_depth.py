"""Which alpha each rule needs for one depth, in the comparison."""

import dataclasses

from tidescour.handoff.design_tables import comparison_table
from tidescour.handoff.tables import row_objects
from tidescour.scour.records import RULES


def test_each_rule_has_its_own_alpha_for_the_same_depth(results):
    # Five alphas that are all different, and others in every row.
    count = len(RULES)
    alphas = {
        (row.stage.name, place.place.opening, place.place.side): tuple(10.0 * at + rule for rule in range(count))
        for place in results.places
        for at, row in enumerate(place.rows, start=len(place.place.side))
    }
    places = tuple(
        dataclasses.replace(
            place,
            rows=tuple(
                dataclasses.replace(row, equal_alpha=alphas[row.stage.name, place.place.opening, place.place.side])
                for row in place.rows
            ),
        )
        for place in results.places
    )
    rows = row_objects(comparison_table(dataclasses.replace(results, places=places)))
    assert len(rows) == count * len(alphas)
    for row in rows:
        expected = alphas[row["stage"], row["opening"], row["side"]]
        assert row["alpha_for_same_depth"] == expected[RULES.index(row["rule"])]
