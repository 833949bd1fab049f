"""How far a run is and how long it may still take, from what it has told so far."""

from __future__ import annotations

import math
from dataclasses import dataclass

from thalweg.study.spec import StudySpec
from thalweg_app.presenters.live import LiveRun

#: Iterates that the trend of the gradient is read from.
TREND = 12


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
    if not live.starts:
        return Estimate(live.stage or "Waiting for a free process", live.fraction, None)
    current = live.starts[-1]
    left = _seconds_left(live)
    spent = sum(s.seconds[-1] for s in live.starts if s.seconds)
    fraction = None if left is None else spent / (spent + left) if spent + left > 0 else None
    n_starts = live.spec.starts
    which = f", start {len(live.starts)} of {n_starts}" if n_starts > 1 else ""
    return Estimate(f"Minimising: iteration {current.iteration[-1]:,}{which}", fraction, left)


def _seconds_left(live: LiveRun) -> float | None:
    current = live.starts[-1]
    here = _this_start(live.spec, current.seconds, current.gradient_norm, current.evaluations)
    if here is None:
        return None
    finished = [s.seconds[-1] for s in live.starts[:-1] if s.seconds]
    each = sum(finished) / len(finished) if finished else current.seconds[-1] + here
    return here + each * max(0, live.spec.starts - len(live.starts))


def _this_start(spec: StudySpec, seconds: list[float], norms: list[float | None], evaluations: list[int]) -> float | None:
    spent = seconds[-1]
    bounds = []
    if spec.stop.seconds:
        bounds.append(max(0.0, spec.stop.seconds - spent))
    if spec.stop.evaluations and evaluations[-1] > 0 and spent > 0:
        bounds.append(spent * (spec.stop.evaluations / evaluations[-1] - 1.0))
    trend = _by_gradient(seconds, norms, spec.stop.gradient)
    if trend is not None:
        bounds.append(trend)
    return max(0.0, min(bounds)) if bounds and (trend is not None or len(seconds) > 1) else None


def _by_gradient(seconds: list[float], norms: list[float | None], limit: float) -> float | None:
    """Seconds until the gradient meets its limit, if it goes on falling by the same factor a second."""
    points = [(t, math.log(n)) for t, n in zip(seconds[-TREND:], norms[-TREND:], strict=True) if n]
    if limit <= 0 or len(points) < 4:
        return None
    (first, high), (last, low) = points[0], points[-1]
    if last <= first or low >= high:
        return None
    return max(0.0, (low - math.log(limit)) * (last - first) / (high - low))
