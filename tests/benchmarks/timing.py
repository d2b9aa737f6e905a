"""Timing one piece of work against another in the same run."""

from __future__ import annotations

import multiprocessing
import statistics
import time
from collections.abc import Callable
from dataclasses import dataclass

CUT_OFF = 60.0


@dataclass(frozen=True, slots=True)
class Row:
    """One comparison; ``rival_seconds`` is a lower bound where ``cut`` is set."""

    work: str
    rival: str
    seconds: float
    rival_seconds: float
    cut: bool
    wanted: float

    def ratio(self) -> float:
        """Return how many times faster the work was done."""
        return self.rival_seconds / self.seconds


def best_of(work: Callable[[], object], runs: int = 5) -> float:
    """Return the median time of some runs, in seconds."""
    times = []
    for _ in range(runs):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return statistics.median(times)


def _child(work: Callable[[], object], channel: multiprocessing.connection.Connection) -> None:
    start = time.perf_counter()
    work()
    channel.send(time.perf_counter() - start)


def rival_time(work: Callable[[], object]) -> tuple[float, bool]:
    """Return the time of one run in a process of its own, and whether it was cut off at 60 s."""
    here, there = multiprocessing.Pipe()
    process = multiprocessing.get_context("fork").Process(target=_child, args=(work, there))
    process.start()
    if here.poll(CUT_OFF):
        seconds = float(here.recv())
        process.join()
        return seconds, False
    process.kill()
    process.join()
    return CUT_OFF, True


def compare(
    work: str, ours: Callable[[], object], rival: str, theirs: Callable[[], object], wanted: float
) -> Row:
    """Time both, the rival once and cut off."""
    rival_seconds, cut = rival_time(theirs)
    return Row(work, rival, best_of(ours), rival_seconds, cut, wanted)
