"""Stands for the worker pool in tests without processes: jobs are kept, and the test says what becomes of them."""

from dataclasses import dataclass, field


@dataclass
class FakeJob:
    function: str
    payload: object
    listener: object
    was_stopped: bool = False

    def stop(self):
        self.was_stopped = True


@dataclass
class FakeStarter:
    jobs: list = field(default_factory=list)

    def start(self, function, payload, listener):
        self.jobs.append(FakeJob(function, payload, listener))
        return self.jobs[-1]

    @property
    def last(self):
        return self.jobs[-1]


class FakeRecent:
    def __init__(self):
        self.paths = []

    def read(self):
        return list(self.paths)

    def write(self, paths):
        self.paths = paths
