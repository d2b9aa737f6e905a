"""Valid records are accepted; every change of one is refused, at the right place."""

from __future__ import annotations

import copy
import json
import re
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

sys.path.insert(0, str(Path(__file__).parent))

from checker_examples import examples
from checker_records import Oracle

from symbolic_response.checker import check_file, check_record

CORPUS = Path(__file__).parent / "checker_corpus"
Keys = tuple[str | int, ...]
NAMES = sorted(examples())

# changes that leave a record true, whatever the new value
FREE = re.compile(r"network\.title|response|sampling\.(seed|count)|"
                  r"network\.symbols\[\d+\]\.range.*")


@pytest.mark.parametrize("name", NAMES)
def test_records_of_the_oracle_are_valid(name: str) -> None:
    verdict = check_record(examples()[name])
    claims, points = (len(examples()[name][key]) for key in ("claims", "points"))
    said = f"{claims} claim{'s' * (claims > 1)}, {points} point{'s' * (points > 1)}"
    assert (verdict.status, verdict.got) == ("valid", said)
    shown = re.sub(r" \((energies|barriers|singles) .*?\)(?=,|$)", "", verdict.statement)
    assert shown.endswith(": " + ", ".join(claim["name"] for claim in examples()[name]["claims"]))


@pytest.mark.parametrize("name", NAMES)
def test_corpus_holds_the_records_of_the_oracle(name: str) -> None:
    path = CORPUS / "valid" / f"{name}.json"
    assert json.loads(path.read_text(encoding="utf-8")) == examples()[name]
    assert check_file(path).status == "valid"


VERDICTS = json.loads((CORPUS / "verdicts.json").read_text(encoding="utf-8"))


@pytest.mark.parametrize("file", sorted(VERDICTS))
def test_corpus_of_what_is_refused(file: str) -> None:
    verdict = check_file(CORPUS / file)
    assert [verdict.status, verdict.entry] == VERDICTS[file]
    assert verdict.status == file.partition("/")[0]


def test_every_file_of_the_corpus_has_a_verdict() -> None:
    files = {str(path.relative_to(CORPUS)) for path in CORPUS.glob("*/*.json")}
    assert {file for file in files if not file.startswith("valid/")} == set(VERDICTS)


def leaves(value: Any, keys: Keys = ()) -> Iterator[Keys]:
    inner = value.items() if isinstance(value, dict) else (
        enumerate(value) if isinstance(value, list) else ())
    for key, child in inner:
        yield (*keys, key)
        yield from leaves(child, (*keys, key))


def entry_of(keys: Keys) -> str:
    return "".join(f"[{key}]" if isinstance(key, int) else f".{key}" for key in keys).lstrip(".")


def get(record: Any, keys: Keys) -> Any:
    for key in keys:
        record = record[key]
    return record


def changed(record: Any, keys: Keys, value: Any) -> Any:
    new = copy.deepcopy(record)
    get(new, keys[:-1])[keys[-1]] = value
    return new


def others(value: Any) -> list[Any]:
    """Return values of the same kind that differ."""
    if isinstance(value, bool):
        return [not value]
    if isinstance(value, int):
        return [value + 1]
    if isinstance(value, str) and re.fullmatch(r"-?\d+(/\d+)?", value):
        top, _, low = value.partition("/")
        return [f"{int(top) + int(low or 1)}{'/' + low if low else ''}", "1000001/1000003"]
    if isinstance(value, str) and "*ln(" in value:
        return [value.replace("*ln(", "7*ln("), value.replace("/", "1/")]
    return ["other", "0"] if isinstance(value, str) else []


def may_stay_valid(record: Any, keys: Keys, new: Any) -> bool:
    """Is the record with the change true of other things, so that it may be valid?"""
    entry = entry_of(keys)
    if FREE.fullmatch(entry):
        return True
    if keys[0] == "points":  # only the worst points are pinned
        return keys[1] not in {claim["worst"]["point"] for claim in record["claims"]}
    if entry.endswith(".sign"):
        return bool(new == "real")
    return False


@pytest.mark.parametrize("name", NAMES)
def test_changed_values(name: str) -> None:
    record = examples()[name]
    for keys in leaves(record):
        for new in others(get(record, keys)):
            verdict = check_record(changed(record, keys, new))
            if verdict.status == "valid":
                assert may_stay_valid(record, keys, new) or harmless(record, keys), (keys, new)
            else:
                assert verdict.status in ("invalid", "malformed")
                assert re.match(rejected_at(keys), verdict.entry), (keys, new, verdict)


def harmless(record: Any, keys: Keys) -> bool:
    """Is it the name of a transition that nothing refers to, or a rate that has no effect?"""
    if keys[:2] == ("network", "transitions") and keys[-1] == "name":
        rest = json.dumps([record["perturbation"], record["claims"]])
        return f'"{get(record, keys)}"' not in rest
    if keys[0] == "target" and record["target"]["kind"] == "log-ratio" and len(keys) == 3:
        # the logarithm of what one state alone has: a factor does not matter
        values = [text for text in record["target"][keys[1]].values() if text != "0"]
        return values == [get(record, keys)]
    # no response at all: neither rates nor values of the observable are seen
    return all(claim["worst"]["left"] == "0" for claim in record["claims"])


def rejected_at(keys: Keys) -> str:
    """Return the pattern of the entries that may reject a change there."""
    entry = re.escape(entry_of(keys))
    if keys[0] == "points":
        return rf"{entry}|network\.transitions|claims"
    if keys[0] == "claims":
        return rf"claims\[{keys[1]}\]" if keys[2] in ("name", "parts") else entry
    if keys[0] in ("network", "target", "perturbation", "path"):
        return "network|target|perturbation|path|claims|points"
    return entry


@pytest.mark.parametrize("name", NAMES)
def test_values_of_another_type(name: str) -> None:
    record = examples()[name]
    for keys in leaves(record):
        old = get(record, keys)
        for new in (None, True, 1.5, 7, [], {}, "", "\ud800", [old], {"a": old}, 10**30):
            if new == old or may_be(keys, old, new):
                continue
            verdict = check_record(changed(record, keys, new))
            if verdict.entry == "sampling.count" and keys == ("points",):
                continue  # fewer points than are said to be drawn
            assert verdict.status == "malformed", (keys, new, verdict)
            top = re.escape(entry_of(keys))
            if keys[0] in ("target", "perturbation", "path"):  # null together, kinds with keys
                top = rf"{keys[0]}|target"
            assert re.match(top, verdict.entry), (keys, new, verdict)


def may_be(keys: Keys, old: Any, new: Any) -> bool:
    """Is the new value of a type that is right in that place?"""
    if keys[-1] in ("title", "response", "seed"):
        return new == ""
    if keys[-1] in ("energies", "barriers", "singles"):
        return new == {}
    return (keys[-1] in ("g", "backward") and new is None) or (
        isinstance(old, int) and type(new) is int and keys[-1] != "version") or (
        isinstance(old, bool) and isinstance(new, bool)) or keys == ("network", "symbols")


@pytest.mark.parametrize("name", NAMES)
def test_keys_and_members_removed_and_added(name: str) -> None:
    record = examples()[name]
    for keys in leaves(record):
        parent = get(record, keys[:-1])
        new = copy.deepcopy(record)
        if isinstance(parent, dict):
            del get(new, keys[:-1])[keys[-1]]
            verdict = check_record(new)
            assert verdict.status in ("malformed", "invalid"), keys
            wanted = r"claims\[0\]" if "parts" in keys[:-1] else re.escape(entry_of(keys))
            assert re.match(wanted, verdict.entry), (keys, verdict)
            get(new, keys[:-1]).update({keys[-1]: get(record, keys), "extra": "1"})
            verdict = check_record(new)
            assert verdict.status == "malformed"
            assert verdict.entry.startswith(entry_of(keys[:-1]) or "file")
        elif keys[0] not in ("points", "claims") and keys[-2] != "symbols":
            get(new, keys[:-1]).append(parent[0])
            assert check_record(new).status in ("malformed", "invalid"), keys
            get(new, keys[:-1])[:] = parent[1:]
            assert check_record(new).status in ("malformed", "invalid"), keys


@pytest.mark.parametrize("name", NAMES)
def test_points_in_another_order(name: str) -> None:
    record = copy.deepcopy(examples()[name])
    record["points"].append(record["points"].pop(0))
    verdict = check_record(record)
    if all(claim["worst"]["ratio"] == "0" for claim in record["claims"]):
        # no response: the ratio is 0 everywhere, and the right side at the worst point moved
        assert verdict.entry.startswith("claims[0].worst.right") or verdict.status == "valid"
    elif re.search("covariance|exact", record["claims"][0]["name"]) and verdict.status == "invalid":
        assert verdict.entry.startswith("claims[0].worst.left")  # every ratio is 1
    else:
        assert verdict.status == "invalid" and verdict.entry.endswith("worst.point"), verdict


@pytest.mark.parametrize("name", NAMES)
def test_another_network(name: str) -> None:
    record = examples()[name]
    for other in examples().values():
        if other["network"] != record["network"]:
            verdict = check_record({**record, "network": other["network"]})
            assert verdict.status in ("malformed", "invalid"), (name, other["network"]["title"])
            assert re.match("target|perturbation|path|claims|points", verdict.entry), verdict


@pytest.mark.parametrize("name", NAMES)
def test_wrong_names_of_claims(name: str) -> None:
    record = examples()[name]
    every = {claim["name"] for one in examples().values() for claim in one["claims"]}
    for i, claim in enumerate(record["claims"]):
        for other in every - {claim["name"]}:
            verdict = check_record(changed(record, ("claims", i, "name"), other))
            if verdict.status == "valid":  # as with one cycle, where F_max is abs(ln r)
                at = Oracle(record["network"], record["points"][claim["worst"]["point"]],
                            record["perturbation"])
                sides = [at.sides(one, record["target"], record["perturbation"], None, None)
                         for one in (claim["name"], other)]
                assert sides[0] == sides[1]
            else:
                assert verdict.entry.startswith("claims["), verdict


@pytest.mark.parametrize("name", NAMES)
def test_directions_exchanged(name: str) -> None:
    record = examples()[name]
    for e, step in enumerate(record["network"]["transitions"]):
        new = changed(record, ("network", "transitions", e, "between"), step["between"][::-1])
        verdict = check_record(new)
        pinned = [claim["worst"]["left"] for claim in record["claims"]]
        assert verdict.status == "invalid" or set(pinned) == {"0"}, (name, step["name"])
