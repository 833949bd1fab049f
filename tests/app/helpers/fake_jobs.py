"""Jobs for tests of the worker: each stands for one thing that can happen to a calculation."""

import os
import signal
import time

from thalweg.errors import Stopped, StudyError
from thalweg.study.events import Iteration, Stage


def echo(payload, emit, should_stop):
    return payload


def chatter(payload, emit, should_stop):
    """Many iterations in little time, then a stage."""
    for i in range(payload):
        emit(Iteration(start=0, iteration=i, evaluations=i, energy=-1.0, gradient_norm=None, seconds=0.0))
    emit(Stage(text="after"))
    return "end"


def print_noise(payload, emit, should_stop):
    print("a library prints this")
    os.write(1, b"and this from C\n")
    return "clean"


def polite(payload, emit, should_stop):
    while not should_stop():
        time.sleep(0.005)
    return "best so far"


def slow_to_hand_over(payload, emit, should_stop):
    while not should_stop():
        time.sleep(0.005)
    time.sleep(60)


def stopped_early(payload, emit, should_stop):
    while not should_stop():
        time.sleep(0.005)
    raise Stopped("stopped-by-person")


def deaf(payload, emit, should_stop):
    emit(Stage(text="deaf"))
    time.sleep(60)


def killed(payload, emit, should_stop):
    os.kill(os.getpid(), signal.SIGKILL)


def out_of_memory(payload, emit, should_stop):
    raise MemoryError


def wrong_input(payload, emit, should_stop):
    raise StudyError("Too many electrons", "only 2 fit", "Take fewer", "system.charge")


def defect(payload, emit, should_stop):
    raise ZeroDivisionError("a defect")


def process_id(payload, emit, should_stop):
    return os.getpid()
