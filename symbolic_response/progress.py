"""Progress on standard error for whatever takes longer than a second."""

from __future__ import annotations

import sys
import threading
from types import TracebackType


class Progress:
    """Shows what is going on once it has taken a second; call it with (done, total).

    On a terminal a moving line that disappears; elsewhere one plain note for each stage.
    """

    def __init__(self, quiet: bool) -> None:
        self._quiet = quiet
        self._stage = ""
        self._counts: tuple[int, int] | None = None
        self._stop = threading.Event()
        self._thread: threading.Thread | None = None

    def __enter__(self) -> Progress:
        if not self._quiet:
            self._thread = threading.Thread(target=self._watch, daemon=True)
            self._thread.start()
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self._stop.set()
        if self._thread is not None:
            self._thread.join()

    def __call__(self, done: int, total: int) -> None:
        self._counts = (done, total)

    def stage(self, name: str) -> None:
        """Say what comes next."""
        self._stage, self._counts = name, None

    def _line(self) -> str:
        if self._counts is None:
            return self._stage
        return f"{self._stage} ({self._counts[0]} of {self._counts[1]})"

    def _watch(self) -> None:
        if self._stop.wait(1.0):
            return
        if sys.stderr.isatty():
            self._moving()
        else:
            self._plain()

    def _plain(self) -> None:
        said = None
        while not self._stop.is_set():
            if self._stage != said:
                said = self._stage
                print(f"working: {self._line()}", file=sys.stderr, flush=True)
            self._stop.wait(1.0)

    def _moving(self) -> None:
        from rich.console import Console
        from rich.progress import Progress as Bar
        from rich.progress import SpinnerColumn, TextColumn, TimeElapsedColumn

        columns = (SpinnerColumn(), TextColumn("{task.description}", markup=False),
                   TimeElapsedColumn())
        with Bar(*columns, console=Console(stderr=True), transient=True) as bar:
            task = bar.add_task(self._line())
            while not self._stop.wait(0.2):
                bar.update(task, description=self._line())
