"""The valid records that the tests of the checker start from."""

from __future__ import annotations

import functools

from checker_records import Json, barrier, drive, energy, network, record, symbol, target

PAIR = network("pair", "A B", [("one", "A", "B", "4*k", "k"), ("two", "A", "B", "1", "4")], "k")
RING = network("ring", "A B C", [
    ("bind", "A", "B", "a*c", "b"), ("turn", "B", "C", "2*a", "b/3"),
    ("leave", "C", "A", "c**2", "1.5")], "a b c")
ONE_WAY = network("one-way ring", "A B C", [
    ("bind", "A", "B", "a", "b"), ("turn", "B", "C", "2", "1/3"), ("burn", "C", "A", "a + b")],
    "a b")
SQUARE = network("square with chord", "A B C D", [
    ("ab", "A", "B", "x", "y"), ("bc", "B", "C", "3", "x"), ("cd", "C", "D", "y", "2"),
    ("da", "D", "A", "x*y", "1"), ("ac", "A", "C", "x", "5")], "x y")
LEVELS = network("levels", "A B C", [
    ("low", "A", "B", "exp(E - B + F/2)", "exp(-B - F/2)"),
    ("high", "B", "C", "sqrt(k**2)*exp(ln(k) - E)", "1/k"), ("back", "C", "A", "3", "1")],
    "k", "E B F")
BRIDGE = network("bridge", "A B C D", [
    ("ab", "A", "B", "x", "1"), ("bc", "B", "C", "2", "x"), ("ca", "C", "A", "y", "3"),
    ("cd", "C", "D", "x", "y")], "x y")

XY = [{"x": "2", "y": "3"}, {"x": "1/5", "y": "7"}, {"x": "1", "y": "1/9"},
      {"x": "33/64", "y": "8"}]
AB = [{"a": "2", "b": "3"}, {"a": "1/5", "b": "7"}, {"a": "9", "b": "1/9"}]
ABC = [{"a": "2", "b": "3", "c": "1/2"}, {"a": "1/5", "b": "7", "c": "3"},
       {"a": "1", "b": "1", "c": "1"}]
LOGS = [{"k": "2", "E": "2*ln(3/2)", "B": "-1*ln(2)", "F": "4*ln(3)"},
        {"k": "1/3", "E": "2*ln(5/4)", "B": "0", "F": "0"},
        {"k": "5", "E": "-2*ln(2)", "B": "3*ln(7/5)", "F": "2*ln(1/2)"}]

ODDS = target("log-ratio", {"A": "1", "B": "0", "C": "0"}, {"A": "0", "B": "1", "C": "0"})
MIXED = target("log-ratio", {"A": "1", "B": "1/2", "C": "0"}, {"A": "0", "B": "1", "C": "3*c"})
MEAN = target("mean", {"A": "0", "B": "1/2", "C": "2"})
FOUR = target("mean", {"A": "-1", "B": "x", "C": "2", "D": "0"})


def parts(energies: Json, barriers: Json, singles: Json) -> Json:
    return {"energies": energies, "barriers": barriers, "singles": singles}


def current(transition: str) -> Json:
    return {"kind": "current", "transition": transition}


def bundle(*transitions: str) -> Json:
    return {"kind": "bundle", "transitions": list(transitions)}


@functools.cache
def examples() -> dict[str, Json]:
    """Return all valid records by name."""
    flat = {"A": "1", "B": "1", "C": "1"}
    return {
        "pair": record(PAIR, [{"k": "1"}, {"k": "2"}, {"k": "1/7"}], ["barrier", "end-pair"],
                       target("log-ratio", {"A": "1", "B": "0"}, {"A": "0", "B": "1"}),
                       barrier("one")),
        "ring-energy": record(RING, ABC, ["energy-covariance", "energy-range"], MEAN, energy("B")),
        "ring-energy-ratio": record(RING, ABC, ["energy-covariance", "energy-range"],
                                    target("ratio", MEAN["above"], flat), energy("C")),
        "ring-energy-odds": record(RING, ABC, ["energy-range"], MIXED, energy("B")),
        "ring-barrier": record(
            RING, ABC, ["splitting-end-pair", "barrier", "end-pair", "splitting-barrier"],
            target("log-ratio", flat, {"A": "c", "B": "1", "C": "0"}), barrier("turn")),
        "ring-drive": record(RING, ABC, ["drive", "splitting-drive"], MEAN, drive("leave")),
        "ring-symbol": record(
            RING, ABC, ["parameter"], MEAN, symbol("c"),
            parts=parts({"A": "1"}, {}, {"leave": "3"})),
        "ring-support": record(RING, ABC, ["support"], target("ratio", *[ODDS[k] for k in
                               ("above", "below")]), symbol("a", False)),
        "ring-path": record(RING, ABC, ["path"], path={"from": "A", "to": "C"}),
        "one-way-barrier": record(ONE_WAY, AB, ["barrier", "end-pair", "splitting-barrier"],
                                  MEAN, barrier("turn")),
        "one-way-step": record(ONE_WAY, AB, ["drive", "splitting-drive"], MEAN, drive("burn")),
        "one-way-symbol": record(
            ONE_WAY, AB, ["parameter"], MEAN, symbol("a"),
            parts=parts({}, {}, {"bind": "1", "burn": "a/(a + b)"})),
        "square-splitting": record(
            SQUARE, XY, ["barrier", "end-pair", "splitting-barrier", "splitting-end-pair"],
            FOUR, barrier("ac")),
        "square-parameter": record(
            SQUARE, XY, ["parameter", ], target("mean", {"A": "0", "B": "1", "C": "1", "D": "3"}),
            symbol("x"), parts=parts({"A": "1/2"}, {"ab": "1/4", "bc": "1/2", "ac": "1/4"},
                                     {"da": "3/2", "ab": "1/2", "bc": "1", "ac": "1/2"})),
        "square-path": record(SQUARE, XY, ["path"], path={"from": "D", "to": "B"}),
        "levels-symbol": record(
            LEVELS, LOGS, ["parameter"], MEAN, symbol("B", False),
            parts=parts({}, {"low": "1"}, {})),
        "levels-drive": record(
            LEVELS, LOGS, ["parameter"],
            target("mean", {"A": "exp(E)", "B": "k", "C": "0"}), symbol("F", False),
            parts=parts({}, {}, {"low": "1"})),
        "bridge": record(BRIDGE, XY, ["barrier", "end-pair", "splitting-barrier"],
                         target("mean", {"A": "0", "B": "0", "C": "0", "D": "1"}), barrier("cd")),
        "current-bridge": record(BRIDGE, XY, ["current-exact", "current-range"],
                                 current("bc"), barrier("bc")),
        "current-one-way": record(ONE_WAY, AB, ["current-range", "current-exact"],
                                  current("burn"), drive("burn")),
        "current-square": record(SQUARE, XY, ["current-exact"], current("ac"), drive("ac")),
        "set-square": record(SQUARE, XY, ["bundle", "directed-bundle"], FOUR,
                                bundle("ab", "bc")),
        "set-one-way": record(ONE_WAY, AB, ["bundle"], MEAN, bundle("bind", "turn")),
        "set-bridge": record(BRIDGE, XY[1::2], ["bundle"], FOUR, bundle("bc", "cd")),
        "set-block": record(BRIDGE, XY, ["bundle", "directed-bundle"],
                        target("ratio", dict(zip("ABCD", "1200", strict=True)),
                               dict(zip("ABCD", "1111", strict=True))),
                        bundle("ab", "bc", "ca")),
        "set-pair": record(PAIR, [{"k": "2"}, {"k": "1/7"}],
                              ["bundle", "directed-bundle"],
                              target("log-ratio", {"A": "1", "B": "0"}, {"A": "0", "B": "1"}),
                              symbol("k")),
        "set-directed": record(RING, ABC, ["directed-bundle"], MIXED, symbol("b")),
    }
