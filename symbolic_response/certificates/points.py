"""Certificates that inequalities hold at many exact points, and how tight they are there."""

from __future__ import annotations

import multiprocessing
import os
import signal
import threading
from collections.abc import Callable, Iterable, Iterator, Sequence
from concurrent.futures import Executor, Future, ProcessPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass, replace
from typing import Any, TypeVar

from symbolic_response.bounds.claim import Claim
from symbolic_response.bounds.registry import PATH, claims_for
from symbolic_response.bounds.target import target_of
from symbolic_response.certificates.axes import value_text
from symbolic_response.certificates.sampling import Sampler, Values
from symbolic_response.certificates.search import Found, search, search_stretch
from symbolic_response.certificates.tally import (
    Place,
    Stretch,
    Tally,
    Tried,
    tally_points,
    try_stretch,
)
from symbolic_response.errors import AssignmentError, QuantityError, UndecidedError
from symbolic_response.expressions.text import fraction_text
from symbolic_response.expressions.tree import Expression, Function
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import Response
from symbolic_response.response.analysis import Analysis

COUNT = 1000
STRETCH = 125

Step = Callable[[int, int], None]
Result = TypeVar("Result")


@dataclass(frozen=True, slots=True)
class Refutation:
    """An exact point at which a claim fails: the values of all symbols, and both sides."""

    claim: Claim
    values: Values
    place: Place

    def message(self) -> str:
        """Return what failed and where, in one line."""
        at = values_text(self.values) or "the only point"
        sides = ", ".join(
            f"{fraction_text(term.factor)}"
            + (f" * tanh(ln({fraction_text(term.g)})/{term.divisor})" if term.g is not None else "")
            for term in self.place.right
        )
        return (f"{self.claim.name} is refuted at {at}: the left side is"
                f" {fraction_text(self.place.left)}, the terms of the right side are {sides}")


@dataclass(frozen=True, slots=True)
class Certified:
    """One claim of a certificate; ``skipped`` says what the search could not do."""

    claim: Claim
    holds: int
    worst: Place
    skipped: str | None


@dataclass(frozen=True, slots=True)
class PointCertificate:
    """Claims about one response with all points they were tried at.

    ``points``: ``count`` samples drawn from ``seed``, then those of the search. Where a claim
    fails, ``refuted`` has the point, ``claims`` is empty, and there is nothing to write.
    """

    network: Network
    response: str
    quantity: Expression
    seed: str
    count: int
    points: tuple[Values, ...]
    claims: tuple[Certified, ...]
    refuted: Refutation | None = None


def values_text(values: Values) -> str:
    """Return the values of symbols in one line."""
    return ", ".join(f"{name} = {value_text(value)}" for name, value in values.items())


def check_seed(seed: str) -> None:
    """Raise AssignmentError for a seed that cannot be written into a record."""
    try:
        seed.encode()
    except UnicodeEncodeError:
        raise AssignmentError("the seed is not a text in UTF-8; write another") from None


def asked_claims(
    quantity: Expression, analysis: Analysis, only: str | None = None
) -> tuple[Claim, ...]:
    """Return the inequalities about a quantity, the path bound of a ratio only as it stands, not
    that of its inverse. Raises QuantityError where there are none."""
    claims = claims_for(quantity, analysis, only)
    ratio = quantity.argument if isinstance(quantity, Function) else quantity
    kept = tuple(claim for claim in claims if claim.name != PATH or claim.left == ratio)
    if not kept:
        raise QuantityError("a one-way path makes the path bound of this ratio infinite; ask for"
                            " the inverse ratio")
    return kept


def certify_claims(
    analysis: Analysis,
    quantity: Expression,
    claims: Sequence[Claim],
    *,
    text: str = "",
    count: int = COUNT,
    seed: str = "0",
    workers: int | None = None,
    executor: Executor | None = None,
    progress: Step | None = None,
) -> PointCertificate:
    """Try claims at ``count`` exact points and where they are tight; every verdict is exact.

    Conjectures can be tried as well. For the arguments and errors see ``certify``."""
    expressions = tuple(symbolic_parts(quantity, analysis.network))
    Sampler(analysis, seed, expressions).point(0)  # refuses at once what cannot be sampled
    whole = Stretch(analysis.network, tuple(claims), expressions, seed, 0, count,
                    analysis.cycle_limit)
    total = count + len(claims)
    report = progress or (lambda done, total: None)
    with process_pool(workers, executor, count) as pool:
        tried = _sample(whole, analysis, pool, lambda done: report(done, total))
        blank = PointCertificate(analysis.network, text, quantity, seed, count, tried.points, ())
        refuted = _first_failure(claims, tried)
        if refuted is not None:
            return replace(blank, refuted=refuted)
        _refuse_undecided(claims, tried)
        found = _search(whole, tried, analysis, pool, lambda done: report(count + done, total))
    for claim, result in zip(claims, found, strict=True):
        if result.failing is not None and result.best is not None:
            return replace(blank, refuted=Refutation(claim, result.best, result.failing))
    return _with_search(blank, whole, tried, found, analysis)


def _with_search(
    blank: PointCertificate,
    whole: Stretch,
    tried: Tried,
    found: Sequence[Found],
    analysis: Analysis,
) -> PointCertificate:
    """Add the points of the search, each of them tried for every claim."""
    extra = list({values_text(result.best): result.best for result in found
                  if result.best is not None}.values())
    known = {values_text(values) for values in tried.points} if extra else set()
    extra = [values for values in extra if values_text(values) not in known]
    later = Tried(tuple(extra),
                  tally_points(analysis, whole.claims, extra, len(tried.points)))
    both = tried.then(later)
    refuted = _first_failure(whole.claims, both)
    if refuted is not None:
        return replace(blank, refuted=refuted)
    _refuse_undecided(whole.claims, both)
    return replace(blank, points=both.points, claims=tuple(
        Certified(claim, tally.holds, _worst(tally), result.skipped)
        for claim, tally, result in zip(whole.claims, both.tallies, found, strict=True)
    ))


def _worst(tally: Tally) -> Place:
    assert tally.worst is not None
    return tally.worst


def _first_failure(claims: Sequence[Claim], tried: Tried) -> Refutation | None:
    failures = [(tally.failing.point, which) for which, tally in enumerate(tried.tallies)
                if tally.failing is not None]
    if not failures:
        return None
    point, which = min(failures)
    place = tried.tallies[which].failing
    assert place is not None
    return Refutation(claims[which], tried.points[point], place)


def _refuse_undecided(claims: Sequence[Claim], tried: Tried) -> None:
    for claim, tally in zip(claims, tried.tallies, strict=True):
        if tally.undecided is not None:
            at = values_text(tried.points[tally.undecided])
            raise UndecidedError(f"{claim.name} is undecided at {at}")


# -- who does the work ---------------------------------------------------------------------


@contextmanager
def process_pool(
    workers: int | None, executor: Executor | None, count: int
) -> Iterator[Executor | None]:
    """Yield an executor, or None where the work at ``count`` points is done here."""
    size = workers or os.cpu_count() or 1
    if executor is not None or size == 1 or (workers is None and count < 2 * STRETCH):
        yield executor
        return
    # a fork beside running threads may hang
    method = "fork" if threading.active_count() == 1 and os.name == "posix" else "spawn"
    pool = ProcessPoolExecutor(size, mp_context=multiprocessing.get_context(method),
                               initializer=_ignore_interrupts)
    try:
        yield pool
    finally:
        pool.shutdown(cancel_futures=True)


def _ignore_interrupts() -> None:
    signal.signal(signal.SIGINT, signal.SIG_IGN)  # the process that started this one answers


def _sample(
    whole: Stretch, analysis: Analysis, pool: Executor | None, report: Callable[[int], None]
) -> Tried:
    stretches = [replace(whole, start=start, stop=min(start + STRETCH, whole.stop))
                 for start in range(0, whole.stop, STRETCH)]
    parts: list[Tried] = []
    if pool is None:
        done = 0

        def step() -> None:
            nonlocal done
            done += 1
            report(done)

        for stretch in stretches:
            parts.append(try_stretch(stretch, analysis, step))
            if any(tally.failing is not None for tally in parts[-1].tallies):
                break
    else:
        futures = [pool.submit(try_stretch, stretch) for stretch in stretches]
        for stretch, part in zip(stretches, results_in_order(futures), strict=False):
            parts.append(part)
            report(stretch.stop)
            if any(tally.failing is not None for tally in part.tallies):
                _cancel(futures)
                break
    tried = parts[0]
    for part in parts[1:]:
        tried = tried.then(part)
    return tried


def _search(
    whole: Stretch,
    tried: Tried,
    analysis: Analysis,
    pool: Executor | None,
    report: Callable[[int], None],
) -> list[Found]:
    starts = [[tried.points[_worst(tally).point]] for tally in tried.tallies]
    found: list[Found] = []
    if pool is None:
        sampler = Sampler(analysis, whole.seed, whole.expressions)
        for claim, start in zip(whole.claims, starts, strict=True):
            found.append(search(claim, analysis, sampler, start))
            report(len(found))
        return found
    futures = [pool.submit(search_stretch, replace(whole, claims=(claim,)), start)
               for claim, start in zip(whole.claims, starts, strict=True)]
    for result in results_in_order(futures):
        found.append(result)
        report(len(found))
    return found


def results_in_order(futures: Sequence[Future[Result]]) -> Iterator[Result]:
    """Yield results in order; when one fails the others are not begun."""
    try:
        for future in futures:
            yield future.result()
    except BaseException:
        _cancel(futures)
        raise


def _cancel(futures: Iterable[Future[Any]]) -> None:
    for future in futures:
        future.cancel()


def symbolic_parts(quantity: Expression, network: Network) -> Iterator[Expression]:
    """Yield the expressions of symbols that must be rational for a response to be."""
    if isinstance(quantity, Response):
        target = target_of(quantity.quantity, network)
        if target is not None:
            yield from target.asked.above
            yield from target.asked.below or ()
