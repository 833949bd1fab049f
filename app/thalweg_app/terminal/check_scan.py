"""The part of `thalweg check` that repeats scans."""

from __future__ import annotations

import sys
from functools import partial
from typing import TYPE_CHECKING

from thalweg.storage.session import ScanRun
from thalweg_app.jobs import Emit, ShouldStop
from thalweg_app.presenters.curve import CurveUnits
from thalweg_app.presenters.wording import significant, unit_name
from thalweg_app.terminal.repetition import repeat_and_tell
from thalweg_app.terminal.scan_display import make_scan_display

if TYPE_CHECKING:
    from thalweg.study.scan_repeat import ScanRepetition


def check_scan(scan: ScanRun, tolerance: float, quiet: bool) -> tuple[bool, int]:
    """Whether the scan held, and the exit status owed to a signal."""
    first = scan.result
    title = f"Scan {scan.number}  {first.label}, {first.axis}"
    if not quiet:
        print(f"Scan {scan.number} of the session: {first.label}, {first.axis}", file=sys.stderr)

    def work(emit: Emit, should_stop: ShouldStop) -> ScanRepetition | None:
        from thalweg.study.executors import make_executor
        from thalweg.study.scan_repeat import repeat_scan

        return repeat_scan(first, lambda: make_executor("local"), emit, should_stop)

    return repeat_and_tell(
        title, work, make_scan_display(CurveUnits(), 0, quiet=quiet), tolerance, partial(_rows, scan), ("has no point to repeat", 0)
    )


def _rows(scan: ScanRun, again: ScanRepetition) -> list[tuple[str, str]]:
    first, unit = scan.result, unit_name(scan.result.energy_unit)
    exact = f"{significant(again.exact_deviation)} {unit}" if again.exact_deviation is not None else ""
    return [
        ("Largest deviation", f"{significant(again.deviation)} {unit} at {again.place:g} {first.unit}".rstrip()),
        ("Exact energies", exact),
        ("Lost points", ", ".join(f"{x:g}" for x in again.lost)),
    ]
