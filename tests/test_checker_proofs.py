"""Records of proofs: right ones are valid, every change is refused or changes what is said."""

from __future__ import annotations

import json
import re
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

sys.path.insert(0, str(Path(__file__).parent))

from checker_proofs import Json, examples
from test_checker_records import changed, entry_of, get, leaves

from symbolic_response.checker import check_record

Keys = tuple[str | int, ...]
NAMES = sorted(examples())
CHANGED = [
    "square with chord-ac-barrier-expanded", "square with chord-ac-barrier-compact",
    "two channels in a ring-one-barrier-expanded", "one-way ring-turn-barrier-expanded",
    "bridge-cd-barrier-expanded", "complete-bd-current-barrier", "ring-turn-drive",
    "four in a ring-bc-second", "finite", "one-way ring-energy", "parameter", "support", "local",
    "ring-path-expanded", "square with chord-path-compact", "one-way-bundle", "block",
    "four in a ring-ab-cd", "bundle-symbol", "several"]


@pytest.mark.parametrize("name", NAMES)
def test_right_records_are_valid(name: str) -> None:
    record = examples()[name]
    verdict = check_record(record)
    assert verdict.status == "valid", verdict
    for one in record.get("records", [record]):
        claims = ", ".join(claim["name"] for claim in one["claims"])
        assert f": {claims}" in verdict.statement
    for form in ("expanded", "compact"):
        assert (f'"form": "{form}"' in json.dumps(record)) == (f": {form}" in verdict.got)
    assert ("chance of error below 1e-15" in verdict.got) == ("compact" in verdict.got)


@pytest.mark.parametrize(("name", "said"), [
    ("ring-turn-barrier-expanded", "valid (proof for all positive rates; edge turn: expanded; "
     "splitting turn: expanded): d (1/2*p[B] + 2*p[C]) / d barrier[turn]: barrier, end-pair, "
     "splitting-barrier, splitting-end-pair"),
    ("one-way ring-burn-current-drive", "valid (proof for all positive rates; edge burn: expanded):"
     " d current[burn] / d drive[burn]: current-exact, current-range"),
    ("block", "valid (proof for all positive rates; coefficients): "
     "d ln(p[A]/p[B]) / d barrier[ab, bc, ca]: bundle, directed-bundle"),
    ("bundle-symbol", "valid (proof for all positive rates; transport): "
     "d ln(p[A]/p[B]) / d ln z: bundle"),
    ("finite", "valid (proof for all positive rates; edge ac: compact, at a random point modulo "
     "2^61-1, chance of error below 1e-15): change of ln(p[A]/p[B]) where barrier[ac] rises by "
     "2*x: finite-change, finite-end-pair"),
    ("ring-turn-second", "valid (proof for all positive rates; edge turn: compact, at a random "
     "point modulo 2^61-1, chance of error below 1e-15): d^2 ln(p[A]/p[B]) / d barrier[turn]^2: "
     "second-order"),
    ("several", "valid (proof for all positive rates; edge bc: compact, at a random point modulo "
     "2^61-1, chance of error below 1e-15; edge da: expanded; 2 claims, 3 points): "
     "d (y*p[B] + p[C] + 3*p[D]) / d ln x: parameter (energies C 0; "
     "barriers bc 3/2, da 1; singles bc 1, ab 1); "
     "d ln(p[A]/p[B]) / d barrier[one]: barrier, end-pair")])
def test_what_is_said(name: str, said: str) -> None:
    assert str(check_record(examples()[name])) == said


def others(record: Json, keys: Keys, value: Any) -> Iterator[Any]:
    """Return values of the same kind that differ."""
    if isinstance(value, bool):
        yield not value
    elif isinstance(value, int):
        yield from {value + 1, value - 1, 0, 10**40} - {value}
    elif isinstance(value, list):
        yield from (value[1:], value[:-1], value + value[-1:]) if value else ()
    elif isinstance(value, str) and re.fullmatch(r"-?\d+(/\d+)?", value):
        top, _, low = value.partition("/")
        yield from (f"{int(top) + int(low or 1)}{'/' + low if low else ''}", "1000001/1000003")
    elif isinstance(value, str):
        net = (record if "network" in record else record["records"][0])["network"]
        yield from {"other", *net["states"], *(t["name"] for t in net["transitions"])} - {value}


def refused_at(keys: Keys) -> str:
    """Return the pattern of the entries that may refuse a change there."""
    if keys[0] == "records":
        return rf"records\[\d\]\.({refused_at(keys[2:])})" if keys[2:] else "records"
    if keys[0] == "proofs" and len(keys) > 3 and keys[2] not in ("transitions", "cycles"):
        return re.escape(entry_of(keys[:3]))
    if keys[0] == "proofs" and len(keys) > 2:  # a transition's name, from, low ...
        return rf"proofs\[{keys[1]}\]|claims|trees"
    if keys[0] in ("claims", "format", "version", "kind", "domain"):
        return rf"{keys[0]}|file|proofs" if keys == ("kind",) else str(keys[0])
    if keys[-1] == "logarithmic":
        return r"network\.transitions|perturbation\.logarithmic"
    return "trees|proofs|claims|target|perturbation|path"


def harmless(keys: Keys, old: Any, new: Any) -> bool:
    """Is it a cycle listed twice, that no move refers to?"""
    return keys[-1] == "cycles" and isinstance(old[0], list) and new == [*old, old[-1]]


@pytest.mark.parametrize("name", CHANGED)
def test_changed_values(name: str) -> None:
    record, said = examples()[name], str(check_record(examples()[name]))
    for keys in leaves(record):
        place = keys[2:] if keys[0] == "records" else keys
        if not place or place[0] in ("network", "response", "points", "sampling") or (
                keys[:2] == ("records", 1)):
            continue
        for new in others(record, keys, get(record, keys)):
            verdict = check_record(changed(record, keys, new))
            if harmless(keys, get(record, keys), new):
                assert verdict.status == "valid"
            elif verdict.status == "valid":
                assert str(verdict) != said, (keys, new)
                assert place[0] in ("claims", "target", "perturbation"), (keys, new, verdict)
            else:
                assert verdict.status in ("invalid", "malformed"), (keys, new, verdict)
                assert re.match(refused_at(keys), verdict.entry), (keys, new, verdict)


@pytest.mark.parametrize("name", CHANGED)
def test_values_of_another_type(name: str) -> None:
    record = examples()[name]
    for keys in leaves(record):
        place = keys[2:] if keys[0] == "records" else keys
        if not place or place[0] in ("network", "response", "points", "sampling") or (
                keys[:2] == ("records", 1)):
            continue
        old = get(record, keys)
        for new in (None, True, 1.5, {}, "", "\ud800", [old], {"a": old}, -1):
            if new == old or (place[-1] in ("energies", "barriers", "singles") and new == {}):
                continue
            if place == ("trees",) and new is None and "expanded" not in json.dumps(record) and (
                    "transport" not in json.dumps(record)):
                continue
            verdict = check_record(changed(record, keys, new))
            assert verdict.status == "malformed", (keys, new, verdict)


@pytest.mark.parametrize("name", CHANGED)
def test_keys_removed_and_added(name: str) -> None:
    record = examples()[name]
    for keys in [(), *leaves(record)]:
        parent = get(record, keys)
        if not isinstance(parent, dict):
            continue
        for new in [{k: v for k, v in parent.items() if k != key} for key in parent] + [
                {**parent, "extra": 1}]:
            if keys and keys[-1] in ("energies", "barriers", "singles"):
                continue
            verdict = check_record(changed(record, keys, new) if keys else new)
            assert verdict.status == "malformed", (keys, new, verdict)


def rejected(record: Json, status: str, entry: str, expected: str = "") -> None:
    verdict = check_record(record)
    assert (verdict.status, verdict.entry) == (status, entry), verdict
    assert expected in verdict.expected, verdict


def edited(name: str, *changes: tuple[Any, ...]) -> Json:
    record = examples()[name]
    for *keys, value in changes:
        record = changed(record, tuple(keys), value)
    return record
