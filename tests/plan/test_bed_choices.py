import pytest

from tidescour.errors import PlanError


@pytest.mark.parametrize(
    ("before", "after", "message"),
    [
        (
            "[bed]\n",
            '[bed]\nvelocity_profile = "log-lew"\n',
            'bed.velocity_profile: found "log-lew"; did you mean "log-law"?',
        ),
        ("[bed]\n", '[bed]\nshields = "soulsbi"\n', 'bed.shields: found "soulsbi"; did you mean "soulsby"?'),
        (
            "[protection.basin]\n",
            '[protection.basin]\nspreading = "plain-jet"\n',
            'protection.basin.spreading: found "plain-jet"; did you mean "plane-jet"?',
        ),
    ],
)
def test_a_name_that_the_bed_does_not_know_is_refused_with_the_nearest(read, edit, plan_text, before, after, message):
    with pytest.raises(PlanError) as raised:
        read(edit(plan_text, (before, after)))
    assert any(message in problem for problem in raised.value.problems)
