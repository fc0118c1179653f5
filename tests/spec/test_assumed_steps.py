"""What is stated to move in full step and counts as independent in the worst case is said."""

import pytest
from makers import BRIEF, brief

from tcplan.spec.assumed import assumptions
from tcplan.workflow.planning import make_plan

FILM = """
[material.{name}]
source = "invented"
reference = "{reference}"
valid = ["-60 degC", "160 degC"]
tc1 = "{tc1} ppm/K"
ohm_per_square = "200 ohm"
[material.{name}.spread]
meaning = "limits"
ohm_per_square = "15 %"
tc1 = "10 ppm/K"
"""
STEP = """
[[correlation]]
between = ["oak.ohm_per_square", "elm.ohm_per_square"]
value = 1.0
"""


@pytest.mark.parametrize(("reference", "said"), [("25 degC", False), ("27 degC", True)])
def test_a_full_step_that_does_not_count_is_told(reference, said):
    films = FILM.format(name="oak", reference=reference, tc1=-150) + FILM.format(
        name="elm", reference=reference, tc1=220
    )
    plan = make_plan(brief(BRIEF + '[search]\narrangements = ["series"]\n' + films + STEP))
    told = " ".join(assumptions(plan))
    assert ("the values of elm, oak count as independent" in told) is said
