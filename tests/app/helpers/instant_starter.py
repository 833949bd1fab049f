"""Runs jobs at once in the test's own process, so that a window can be driven through a whole study without waiting for processes."""

from dataclasses import dataclass

from thalweg_app.presenters.jobs import DRAW, INSPECT
from thalweg_app.worker_process import failure_of, find


@dataclass
class EndedJob:
    def stop(self):
        """Nothing is under way."""


class InstantStarter:
    """`skipped` functions are noted and not run: figures and drawings are not what these tests look at."""

    def __init__(self, skipped=(INSPECT, DRAW)):
        self.skipped, self.started = skipped, []

    def start(self, function, payload, listener):
        self.started.append(function)
        if function in self.skipped:
            return EndedJob()
        try:
            value = find(function)(payload, lambda event: listener.events([event]), lambda: False)
        except Exception as error:
            listener.failed(failure_of(error))
        else:
            listener.done(value)
        return EndedJob()


def scan_here(payload, emit, should_stop):
    """The scan job without a pool of processes."""
    from thalweg.study.executors import InProcess
    from thalweg.study.scan import run_scan
    from thalweg.study.scan_spec import ScanSpec

    run_scan(ScanSpec.model_validate(payload["scan"]), InProcess, emit, should_stop)
