"""Which claims there can be for a target and a perturbation, points and values aside."""

from __future__ import annotations

from collections.abc import Sequence

from .expressions import Expression
from .reading import invalid
from .record import Asked, Claim

APPLIES = {
    "path": ("path",),
    "energy": ("energy-covariance", "energy-range"),
    "barrier": ("barrier", "end-pair", "splitting-barrier", "splitting-end-pair"),
    "drive": ("drive", "splitting-drive"),
    "bundle": ("parameter", "bundle", "directed-bundle"),
    "symbol": ("parameter", "support", "bundle", "directed-bundle", "local-change",
               "local-end-pair"),
    "second-barrier": ("second-order",),
    "finite-barrier": ("finite-change", "finite-end-pair"),
}
CURRENT = ("current-exact", "current-range")
EQUALITIES = ("energy-covariance", "current-exact")


def check_applies(asked: Asked, claims: Sequence[Claim]) -> None:
    """Check the names of the claims, and that observables do not change."""
    moved, target = asked.perturbation, asked.target
    known = APPLIES[moved.kind if moved else "path"]
    if target and moved:
        if target.kind == "current":
            known = CURRENT
            if moved.kind not in ("barrier", "drive") or moved.place != target.place:
                raise invalid("perturbation", "a barrier or drive of the transition of the current",
                              moved.kind)
        if moved.kind in ("second-barrier", "finite-barrier") and target.kind != "log-ratio":
            raise invalid("target.kind", f"log-ratio for {moved.kind}", target.kind)
        for entry, side in (("above", target.above), ("below", target.below)):
            for state, one in zip(asked.network.states, side or (), strict=False):
                if moved.symbol in one.symbols:
                    raise invalid(f"target.{entry}.{state}",
                                  "no symbol that is the perturbation", one.text[:80])
    for i, claim in enumerate(claims):
        if claim.name not in known:
            raise invalid(f"claims[{i}].name", "one of " + ", ".join(known), claim.name)
        if target and claim.name.startswith(("energy-covariance", "splitting")) and not (
                target.kind == "mean" or constant(target.above) or constant(target.below)):
            raise invalid(f"claims[{i}].name", "above or below the same for every state",
                          claim.name)


def constant(side: list[Expression] | None) -> bool:
    """Has an observable the same text for every state?"""
    return side is not None and len({one.text for one in side}) == 1
