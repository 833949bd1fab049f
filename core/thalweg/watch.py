"""How long work reports itself and is stopped, without knowing who watches."""

from __future__ import annotations

from collections.abc import Callable

from thalweg.errors import Stopped


class Watch:
    """Passed into every long computation. Call `check` at least every 100 ms, `stage` when something worth saying begins."""

    def __init__(
        self,
        say: Callable[[str, float | None], None] = lambda text, fraction: None,
        should_stop: Callable[[], bool] = lambda: False,
        warn: Callable[[str], None] = lambda text: None,
    ) -> None:
        self._say, self._should_stop, self.warn = say, should_stop, warn

    def stage(self, text: str, fraction: float | None = None) -> None:
        """States what is computed now; `fraction` of it done, 0 to 1, where that can be known."""
        self.check()
        self._say(text, fraction)

    def check(self) -> None:
        """Raises Stopped when the person asked to stop."""
        if self._should_stop():
            raise Stopped("stopped-by-person")


SILENT = Watch()
