"""How far a run is and how long it may still take, from what it has told so far."""

from __future__ import annotations

import math
from dataclasses import dataclass

from thalweg.ansatz import Adaptive
from thalweg.study.spec import StudySpec
from thalweg_app.presenters.live import LiveRun, LiveStart

#: Iterates that the trend of the gradient is read from: the later half, and not fewer or many more than these.
TREND = 12
MOST_OF_TREND = 400


@dataclass(frozen=True)
class Estimate:
    """`fraction` and `seconds_left` are None where nothing sensible can be said."""

    text: str
    fraction: float | None
    seconds_left: float | None


def estimate(live: LiveRun) -> Estimate:
    """What the status line shows. Searches are foretold by the trend of the gradient and bounded by the stop rules."""
    if live.is_stopping:
        return Estimate("Stopped; examining the best point" if live.has_noticed else "Stopping; the best point is kept", None, None)
    lead = live.lead
    if lead is None:
        return Estimate(live.stage or "Waiting for a free process", live.fraction, None)
    ahead = _ahead(live)
    spent = sum(s.seconds[-1] for s in live.starts if s.seconds)
    fraction = None if ahead is None else spent / (spent + ahead[0]) if spent + ahead[0] > 0 else None
    return Estimate(_words(live, lead), fraction, None if ahead is None else ahead[1])


def starts_in_words(live: LiveRun, start: int) -> str:
    """`start 3 of 8`, with the number of those done where several are under way; empty for a single one."""
    if live.n_starts < 2:
        return ""
    one = f"start {start + 1} of {live.n_starts}"
    return f"{one} ({live.ended} done, {len(live.running)} under way)" if len(live.running) > 1 else one


def _words(live: LiveRun, lead: int) -> str:
    which = starts_in_words(live, lead)
    if not live.running and which:
        return f"Minimising: {live.ended} of {live.n_starts} starts done"
    return f"Minimising: iteration {live.starts[lead].iteration[-1]:,}" + (f", {which}" if which else "")


def _ahead(live: LiveRun) -> tuple[float, float] | None:
    """Seconds of search to come, of all starts added up, and until the last one ends with as many side by side as now; None if unknown.

    A start of which nothing can be said is expected to take as long as those that have ended, or else as the slowest under way.
    """
    running = [live.starts[k] for k in live.running]
    here = [_this_start(live.spec, s) for s in running]
    ended = [s.seconds[-1] for s in live.starts if s.reason and s.seconds]
    foreseen = [s.seconds[-1] + left for s, left in zip(running, here, strict=True) if left is not None]
    if not ended and not foreseen:
        return None
    usual = sum(ended) / len(ended) if ended else max(foreseen)
    left = [max(0.0, usual - s.seconds[-1]) if h is None else h for s, h in zip(running, here, strict=True)]
    work = sum(left) + usual * max(0, live.n_starts - live.ended - len(running))
    return work, max([work / max(1, len(running)), *left])


def _this_start(spec: StudySpec, start: LiveStart) -> float | None:
    seconds, spent = start.seconds, start.seconds[-1]
    bounds = []
    if spec.stop.seconds:
        bounds.append(max(0.0, spec.stop.seconds - spent))
    for limit, done in ((spec.stop.evaluations, start.evaluations[-1]), (_iterations(spec), start.iteration[-1])):
        if limit and done > 0 and spent > 0:
            bounds.append(spent * (limit / done - 1.0))
    trend = _by_gradient(seconds, start.gradient_norm, spec.stop.gradient)
    if trend is not None:
        bounds.append(trend)
    return max(0.0, min(bounds)) if bounds and (trend is not None or len(seconds) > 1) else None


def _iterations(spec: StudySpec) -> int:
    """After how many iterations a start ends; 0 where it has several searches one after another."""
    several = isinstance(spec.ansatz, Adaptive) or spec.ladder.on or spec.continuation > 1
    return 0 if several else int(getattr(spec.optimizer, "max_iterations", 0))


def _by_gradient(seconds: list[float], norms: list[float | None], limit: float) -> float | None:
    """Seconds until the gradient meets its limit, if it goes on falling by the same factor a second: the straight line nearest to its logarithm.

    The gradient of single iterates goes up and down, so that a line through two of them would foretell now a second, now an hour.
    """
    latest = max(TREND, min(len(seconds) // 2, MOST_OF_TREND))
    points = [(t, math.log(n)) for t, n in zip(seconds[-latest:], norms[-latest:], strict=True) if n]
    if limit <= 0 or len(points) < 4:
        return None
    middle, level = (sum(values) / len(points) for values in zip(*points, strict=True))
    spread = sum((t - middle) ** 2 for t, _ in points)
    slope = sum((t - middle) * (g - level) for t, g in points) / spread if spread > 0 else 0.0
    if slope >= 0:
        return None
    now = level + slope * (points[-1][0] - middle)
    return max(0.0, (math.log(limit) - now) / slope)
