import pytest
import studies

from thalweg.errors import StudyError
from thalweg_app.plots.printing import draw_chart, make_figure
from thalweg_app.presenters.tables import state_chart, terms_chart, terms_of_result
from thalweg_app.presenters.traces import convergence, shown_result

RUN = convergence(shown_result(1, studies.result()), [shown_result(2, studies.result(3e-3))])
STATE = state_chart(studies.result(), log=True)


@pytest.mark.parametrize(("ending", "begins"), [("png", b"\x89PNG"), ("svg", b"<?xml"), ("pdf", b"%PDF")])
def test_every_format_is_written(tmp_path, ending, begins):
    path = tmp_path / f"a.{ending}"
    draw_chart(RUN, path)
    assert path.read_bytes().startswith(begins)


def test_text_of_an_svg_stays_text(tmp_path):
    draw_chart(RUN, tmp_path / "a.svg")
    text = (tmp_path / "a.svg").read_text()
    for words in ("Energy / Eh", "Error against exact / mEh", "Chemical accuracy", "Hartree-Fock", "Run 1"):
        assert words in text


def test_names_are_explained_once():
    legends = [ax.get_legend() for ax in make_figure(RUN).axes]
    names = [text.get_text() for legend in legends if legend is not None for text in legend.get_texts()]
    assert sorted(names) == ["Exact", "Hartree-Fock", "Run 1", "Run 2"]


def test_every_bar_is_inside_the_axes():
    ax = make_figure(STATE).axes[0]
    low, high = ax.get_xlim()
    assert all(low <= bar.get_x() and bar.get_x() + bar.get_width() <= high for bar in ax.patches)


@pytest.mark.parametrize("chart", [terms_chart(terms_of_result(studies.result())), STATE, convergence(None)])
def test_every_picture_can_be_printed(tmp_path, chart):
    draw_chart(chart, tmp_path / "a.png")
    assert (tmp_path / "a.png").stat().st_size > 1000


def test_an_unknown_ending_and_a_missing_folder_are_told(tmp_path):
    with pytest.raises(StudyError, match="png, svg or pdf"):
        draw_chart(RUN, tmp_path / "a.bmp")
    with pytest.raises(StudyError):
        draw_chart(RUN, tmp_path / "missing" / "a.png")
