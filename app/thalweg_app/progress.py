"""How far a minimisation has come and how long it will still take, estimated from its events."""

from __future__ import annotations

import math
import time
from collections.abc import Callable

from thalweg.study.events import AnyEvent, Iteration, Started
from thalweg.study.spec import StudySpec

#: No time left is stated before this part of the work is done.
FIRST_ESTIMATE = 0.02


class StudyProgress:
    """Feed it events; `fraction` and `seconds_left` are estimates, None while there is nothing to judge by.

    A start ends by whichever stop rule is met first, so its fraction is the largest over the rules. A gradient that falls
    about evenly on a logarithmic scale, as quasi-Newton methods have it, is judged by the decades still to fall.
    """

    def __init__(self, spec: StudySpec, clock: Callable[[], float] = time.monotonic) -> None:
        self._spec, self._clock = spec, clock
        self._begun: float | None = None
        self._n_starts = spec.starts
        self._start, self._within = 0, 0.0
        self._first_gradient: float | None = None

    def take(self, event: AnyEvent) -> None:
        if isinstance(event, Started):
            self._begun, self._n_starts = self._clock(), event.n_starts
        elif isinstance(event, Iteration):
            if event.start != self._start:
                self._start, self._within, self._first_gradient = event.start, 0.0, None
            self._within = min(1.0, max(self._within, self._part_done(event)))

    @property
    def fraction(self) -> float | None:
        return None if self._begun is None else min(1.0, (self._start + self._within) / self._n_starts)

    @property
    def seconds_left(self) -> float | None:
        done = self.fraction
        if done is None or self._begun is None or done < FIRST_ESTIMATE:
            return None
        return (self._clock() - self._begun) * (1.0 - done) / done

    def _part_done(self, event: Iteration) -> float:
        rules = self._spec.stop
        parts = [event.iteration / self._spec.optimizer.max_iterations]
        if rules.evaluations:
            parts.append(event.evaluations / rules.evaluations)
        if rules.seconds:
            parts.append(event.seconds / rules.seconds)
        parts.append(self._gradient_part(event.gradient_norm))
        return max(parts)

    def _gradient_part(self, norm: float | None) -> float:
        limit = self._spec.stop.gradient
        if not limit or not norm:
            return 0.0
        if self._first_gradient is None:
            self._first_gradient = norm
        if norm <= limit:
            return 1.0
        if self._first_gradient <= limit or norm >= self._first_gradient:
            return 0.0
        return math.log(self._first_gradient / norm) / math.log(self._first_gradient / limit)
