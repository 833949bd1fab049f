"""Where several starts run, as said on the command line."""

import pytest

from thalweg.study import run as module
from thalweg.study.executors import usable_cores


@pytest.fixture
def used(monkeypatch):
    """What the commands hand to the search as `local`."""
    found, run = [], module.run

    def record(spec, emit, should_stop, local=None, only=None):
        found.append(local)
        return run(spec, emit, should_stop, local, only)

    monkeypatch.setattr(module, "run", record)
    return found


@pytest.mark.parametrize(
    ("words", "workers"),
    [([], usable_cores()), (["--workers", "3"], 3), (["--executor", "local", "--workers", "1"], 1), (["--executor", "serial"], None)],
)
def test_starts_run_where_the_options_say(thalweg, used, words, workers):
    status, out, _ = thalweg("solve", "H2", "--starts", "2", "--quiet", *words)
    assert status == 0
    assert "best of 2 starts" in out
    assert [None if local is None else local.workers for local in used] == [workers]


@pytest.mark.parametrize("words", [["--executor", "dask"], ["--workers", "-1"]])
def test_other_places_are_refused(thalweg, words):
    status, _, err = thalweg("solve", "H2", *words)
    assert status == 2
    assert words[0] in err


def test_spreads_of_starts_take_the_workers_that_are_asked_for(thalweg, used):
    for words in ([], ["--workers", "2"]):
        assert thalweg("diagnose", "H2", "--what", "starts", "--starts", "2", "--quiet", *words)[0] == 0
    assert [None if local is None else local.workers for local in used] == [None, 2]
