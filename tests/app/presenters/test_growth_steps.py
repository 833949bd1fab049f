"""Steps of growth as marks on the curve and as a table. Numbers are invented."""

import studies

from thalweg.study.result import GrowthStep
from thalweg_app.presenters.traces import convergence, growth_table, shown_result


def grown():
    result = studies.result()
    energies = result.trace.energy

    def step(added, iteration, parameters):
        return GrowthStep(
            added=added,
            parameters=parameters,
            two_qubit_gates=8 * parameters,
            energy=energies[iteration],
            error=energies[iteration] - result.exact_energy,
            largest_slope=0.1,
            iteration=result.trace.iteration[iteration],
            evaluations=result.trace.evaluations[iteration],
        )

    steps = (step((), 0, 0), step(("0a 0b -> 2a 2b",), 5, 1), step(("1a -> 3a",), 9, 2))
    return result.model_copy(update={"growth": steps})


def test_a_fixed_trial_state_has_no_steps():
    result = studies.result()
    assert growth_table(result).rows == ()
    assert growth_table(None).rows == ()
    assert [s.name for s in convergence(shown_result(1, result)).panels[0].series] == ["Run 1"]


def test_steps_are_marks_at_the_iterates_that_ended_them():
    result = grown()
    marks = convergence(shown_result(1, result)).panels[0].series[-1]
    assert marks.name == "Steps of growth"
    assert not marks.line
    assert marks.x.tolist() == [result.trace.iteration[i] for i in (0, 5, 9)]
    assert marks.y.tolist() == [result.trace.energy[i] for i in (0, 5, 9)]
    by_evaluations = convergence(shown_result(1, result), x="evaluations").panels[0].series[-1]
    assert by_evaluations.x.tolist() == [result.trace.evaluations[i] for i in (0, 5, 9)]


def test_the_table_lists_what_was_added():
    table = growth_table(grown())
    assert [row[1] for row in table.rows] == ["Hartree-Fock", "0a 0b -> 2a 2b", "1a -> 3a"]
    assert table.rows[2][2:4] == ("2", "16")
