import pytest

from thalweg.encoding import JordanWigner
from thalweg.study.spec import SECTIONS, StudySpec
from thalweg_app.presenters.fields import choice_words, fields_of, help_text


def by_name(options):
    return {facts.name: facts for facts in fields_of(options)}


@pytest.mark.parametrize("options", [StudySpec, *(cls for section in SECTIONS.values() for cls in section)])
def test_every_field_of_every_alternative_has_a_title_and_a_help_text(options):
    for facts in fields_of(options):
        assert facts.title
        assert help_text(facts)


def test_kinds_follow_from_the_annotations():
    spec = by_name(StudySpec)
    assert spec["classical"].kind == "choices"
    assert spec["exact"].kind == "switch"
    assert spec["starts"].kind == "whole"
    assert by_name(JordanWigner)["cut"].kind == "number"
    assert by_name(JordanWigner)["cut"].advanced


def test_bounds_are_put_into_words():
    assert by_name(StudySpec)["starts"].bounds == "from 1 to 1,000"
    assert "above 0" in help_text(by_name(StudySpec)["memory_gib"])


@pytest.mark.parametrize(("key", "words"), [("doubles-first", "Doubles first"), ("ccsd(t)", "CCSD(T)"), ("zero", "Zero"), ("-", "−"), ("+", "+")])
def test_choices_read_as_words(key, words):
    assert choice_words(key) == words
