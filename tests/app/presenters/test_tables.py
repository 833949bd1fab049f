import csv
import io

import numpy as np
import pytest
import studies

from thalweg_app.presenters.chart import chart_data, chart_from_data, csv_of, table_of
from thalweg_app.presenters.tables import (
    matching,
    occupations_chart,
    state_chart,
    state_figures,
    state_table,
    terms_chart,
    terms_of_result,
    terms_table,
)
from thalweg_app.presenters.traces import convergence, shown_result

TERMS = terms_of_result(studies.result())


@pytest.mark.parametrize(
    ("wanted", "found"),
    [("", 5), ("x", 1), ("Z", 2), ("Z0 Z1", 1), ("X0", 1), ("z9", 0), ("I", 1), ("Y0 X2", 0)],
)
def test_the_filter_finds_factors_and_letters(wanted, found):
    assert len(matching(TERMS, wanted)) == found


def test_the_table_gives_weight_and_share_and_says_how_many_there_are():
    table = terms_table(TERMS)
    assert table.rows[1][:4] == ("2", "Z0", "−0.40000000", "1")
    assert float(table.rows[1][4]) == pytest.approx(100 * 0.4 / 9.8765, abs=5e-3)
    assert table.rows[0][4] == "–"  # the constant has no share
    assert "5 heaviest of 631 terms" in table.about


def test_bars_leave_the_constant_out_and_split_by_sign():
    panel = terms_chart(TERMS).panels[0]
    assert panel.categories == ("Z0", "X0 X2", "Z0 Z1", "Y0 Y2")
    positive, negative = panel.bars
    np.testing.assert_array_equal(positive.values, [np.nan, 0.2, 0.1, np.nan])
    np.testing.assert_array_equal(negative.values, [0.4, np.nan, np.nan, 0.05])


def test_a_filter_without_match_says_so():
    assert terms_chart(TERMS, "X9").is_empty
    assert "filter" in terms_chart(TERMS, "X9").empty


def test_the_state_stands_beside_the_exact_one():
    panel = state_chart(studies.result()).panels[0]
    trial, exact = panel.bars
    assert trial.values.tolist() == [0.974, 0.0142, 0.0042]
    assert exact.values[0] == 0.9741
    assert np.isnan(exact.values[2])
    assert state_table(studies.result()).rows[2] == ("2ud000", "0.00420000", "–")


def test_without_a_result_there_is_no_state():
    assert state_chart(None).is_empty
    assert occupations_chart(None).is_empty


def test_figures_of_the_state_leave_out_what_does_not_exist():
    names = [f.name for f in state_figures(studies.result(fidelity=None))]
    assert "N" in names
    assert "Fidelity" not in names


def test_tiny_negative_spin_is_shown_as_zero():
    values = {f.name: f.value for f in state_figures(studies.result(s_z=-1e-16))}
    assert values["S_z"] == "0.000000"


def test_numbers_of_a_picture_survive_as_csv_with_full_precision():
    chart = convergence(shown_result(1, studies.result()))
    rows = list(csv.reader(io.StringIO(csv_of(*table_of(chart)))))
    assert rows[0] == ["quantity", "series", "Iteration", "value"]
    energies = [float(r[3]) for r in rows if r[0] == "Energy / Eh" and r[1] == "Run 1"]
    assert energies == list(studies.result().trace.energy)
    assert any(r[1] == "Exact" for r in rows)


@pytest.mark.parametrize(
    "chart", [convergence(shown_result(1, studies.result())), terms_chart(TERMS), state_chart(studies.result()), convergence(None)]
)
def test_a_chart_survives_the_way_to_the_drawing_process(chart):
    import json

    again = chart_from_data(json.loads(json.dumps(chart_data(chart))))
    assert table_of(again)[0] == table_of(chart)[0]
    for a, b in zip(table_of(again)[1], table_of(chart)[1], strict=True):
        np.testing.assert_equal(a, b)
    assert [p.band for p in again.panels] == [p.band for p in chart.panels]
