"""Several values of one mix in a brief: what is read, and every refusal as one would meet it."""

import pytest
from makers import BRIEF, FILMS, brief

from tcplan.errors import InputError
from tcplan.network import value


def read(values, more=""):
    return brief(BRIEF.replace('value = "18 kohm"', f"value = {values}") + more + FILMS)


def problems(values, more=""):
    with pytest.raises(InputError) as caught:
        read(values, more)
    return [str(problem) for problem in caught.value.problems]


def test_the_first_is_planned_and_the_others_follow_in_their_order():
    made = read('["18 kohm", "36 kohm", "4k7"]')
    assert (made.target.ohms, made.target.also) == (18000.0, (36000.0, 4700.0))
    assert made.to_dict()["resistor"]["value_ohms"] == 18000.0
    assert made.to_dict()["resistor"]["also_ohms"] == [36000.0, 4700.0]


def test_a_list_of_one_is_one_value():
    made = read('["18 kohm"]')
    assert (made.target, made.to_dict()["resistor"]["also_ohms"]) == (read('"18 kohm"').target, [])


def test_how_well_they_are_met_goes_for_all():
    assert read('["18 kohm", "36 kohm"]\ntolerance = "1 %"').target.tolerance == 0.01


def test_a_given_network_is_scaled_to_the_first():
    made = read('["18 kohm", "36 kohm"]', '[given]\nnetwork = "pp 5k1 + np 3k3"\nscaled = true\n')
    assert value(made.given) == pytest.approx(18000.0, rel=1e-12)
    assert made.target.also == (36000.0,)


@pytest.mark.parametrize(
    ("values", "says"),
    [
        ('["18 kohm", "0 ohm"]', "found 0 ohm; expected values above zero"),
        ('["0 ohm"]', "found 0 ohm; expected values above zero"),
        ('["18 kohm", "-1 kohm"]', "found -1 kohm; expected values above zero"),
        ('["18 kohm", "18 kohm"]', "found a value twice"),
        ('["18 kohm", "18000 ohm"]', "found a value twice"),
        ('["18 kohm", "18k0"]', "found a value twice"),
        ('["18 kohm", "18.00001 kohm"]', "expected values that differ in their first 6 digits"),
        ('["18 kohm", "lots"]', "found 'lots', which does not start with a finite number"),
        ('["18 kohm", "free"]', "found 'free'"),
        ('["18 kohm", "5 V"]', "found '5 V', a voltage; expected a resistance"),
        ('["18 kohm", "nan ohm"]', "found 'nan ohm'"),
        ('["18 kohm", "1e999 ohm"]', "found '1e999 ohm'"),
        ('["18 kohm", 36000]', "expected text in quotes"),
        ('[["18 kohm"]]', "expected text in quotes"),
        ("[]", "found a list of 0; expected text in quotes"),
        ('["1 ohm", "lots"]', "found 'lots'"),
    ],
)
def test_a_mistake_is_told_once_and_at_the_value(values, says):
    [found] = problems(values)
    assert found.startswith("brief.toml: resistor.value: ")
    assert says in found


def test_two_mistakes_are_told_both_and_no_third():
    first, second = problems('["a lot", "even more"]')
    assert "'a lot'" in first
    assert "'even more'" in second


def test_too_many_values():
    listed = ", ".join(f'"{k} kohm"' for k in range(1, 200))
    [found] = problems(f"[{listed}]")
    assert "found a list of 199; expected text in quotes" in found
    assert "entries at most" in found


def test_fixed_members_have_one_mix_for_each_value():
    [found] = problems('["18 kohm", "36 kohm"]', '[[fixed]]\nmaterial = "pp"\nvalue = "1 kohm"\n')
    assert "found several values beside fixed members; expected one value. The mix differs." in found


def test_a_network_as_it_is_written_has_a_value_of_its_own():
    [found] = problems('["18 kohm", "36 kohm"]', '[given]\nnetwork = "pp 5k1 + np 3k3"\n')
    assert "found several values beside a network as it is written; expected one value" in found
    assert "Write scaled = true" in found


def test_values_and_a_bound_do_not_go_together():
    [found] = problems('["18 kohm", "36 kohm"]\nat_most = "40 kohm"')
    assert "value and at_most together" in found
