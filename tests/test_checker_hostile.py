"""Hostile files: one line each, no traceback, within time and memory, run as the checker is run."""

from __future__ import annotations

import json
import os
import random
import resource
import runpy
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

sys.path.insert(0, str(Path(__file__).parent))

from checker_examples import examples

from symbolic_response.checker import check_file, reading

ROOT = Path(__file__).parent.parent
CHECKER = ROOT / "symbolic_response" / "checker"
TWO_GB = 2 * 2**30


def limits() -> None:
    resource.setrlimit(resource.RLIMIT_AS, (TWO_GB, TWO_GB))
    resource.setrlimit(resource.RLIMIT_CPU, (120, 120))


def check(*paths: Path | str) -> tuple[int, list[str]]:
    """Run the checker by itself under limits; return its status and its lines."""
    done = subprocess.run([sys.executable, "-I", "-S", str(CHECKER), *map(str, paths)],
                          capture_output=True, text=True, check=False, preexec_fn=limits,
                          timeout=200, cwd="/")
    assert done.stderr == "", done.stderr[-2000:]
    return done.returncode, done.stdout.splitlines()


def verdict(tmp_path: Path, content: str | bytes) -> str:
    path = tmp_path / "record.json"
    path.write_bytes(content if isinstance(content, bytes) else content.encode())
    status, lines = check(path)
    assert len(lines) == 1
    line = lines[0].removeprefix(f"{path}: ")
    word = line.partition(" ")[0].rstrip(":")
    assert status == {"valid": 0, "invalid": 1, "malformed": 2, "incomplete": 3}[word]
    return line


def with_rate(rate: str) -> str:
    record: dict[str, Any] = json.loads(json.dumps(examples()["pair"]))
    record["network"]["transitions"][0]["forward"] = rate
    return json.dumps(record)


def test_all_valid_and_one_of_each(tmp_path: Path) -> None:
    corpus = Path(__file__).parent / "checker_corpus"
    valid = sorted((corpus / "valid").glob("*.json"))
    status, lines = check(*valid)
    assert status == 0 and len(lines) == len(valid)
    assert lines[0].endswith("bridge.json: valid (3 claims, 4 points): d p[D] / d barrier[cd]: "
                             "barrier, end-pair, splitting-barrier")
    bad, worse, over = (corpus / name for name in (
        "invalid/left.json", "malformed/empty.json", "incomplete/nested.json"))
    assert check(valid[0], over)[0] == 3
    assert check(valid[0], over, worse)[0] == 2
    assert check(worse, over, bad, valid[0])[0] == 1


def test_usage() -> None:
    for arguments, status in ((["--help"], 0), ([], 2)):
        done = subprocess.run([sys.executable, "-I", "-S", str(CHECKER), *arguments],
                              capture_output=True, text=True, check=False)
        assert done.returncode == status and done.stderr.startswith("usage:")
        assert done.stdout == ""


def test_it_loads_nothing_of_the_project() -> None:
    code = (f"import runpy, sys\nsys.argv[1:] = [{str(CHECKER.parent / 'nothing')!r}]\n"
            f"try:\n    runpy.run_path({str(CHECKER)!r}, run_name='__main__')\n"
            "except SystemExit as error:\n    print(error.code)\n"
            "print([name for name in sys.modules if 'symbolic' in name or name == 'flint'])\n")
    done = subprocess.run([sys.executable, "-I", "-S", "-c", code], capture_output=True, text=True,
                          check=False, cwd="/")
    assert done.stdout.splitlines()[1:] == ["2", "[]"], done.stderr


def test_the_same_without_a_process(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    pipe, long, here = tmp_path / "pipe", tmp_path / "long", tmp_path / "here"
    os.mkfifo(pipe)
    long.write_bytes(b" " * (64 * 2**20 + 1))
    here.write_text("{}")
    statuses = [check_file(path).status for path in (pipe, tmp_path, long, "a\0b", b"\xff")]
    assert statuses == ["unreadable", "unreadable", "incomplete", "unreadable", "unreadable"]
    monkeypatch.setattr(reading, "MAX_ITEMS", 3)
    here.write_text("[1, 2, 3, 4]")
    line = "incomplete: size limit: file: expected at most 3, got more entries"
    assert str(check_file(here)) == line
    here.write_text("]")
    assert str(check_file(here)).startswith("malformed: file: expected JSON, got a closing bracket")
    for arguments, status in (([str(here)], 2), ([], 2), (["-h"], 0)):
        monkeypatch.setattr(sys, "argv", ["checker", *arguments])
        with pytest.raises(SystemExit) as caught:
            runpy.run_path(str(CHECKER), run_name="__main__")
        assert caught.value.code == status
    assert runpy.run_path(str(CHECKER / "__main__.py"), run_name="read")["main"](["-h"]) == 0
    monkeypatch.delitem(sys.modules, "checker")
    assert capsys.readouterr().out.startswith(f"{here}: malformed")


def test_what_is_no_file(tmp_path: Path) -> None:
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    secret = tmp_path / "secret"
    secret.write_text("x")
    status, lines = check(pipe, tmp_path, tmp_path / "missing", "/dev/zero", "/dev/null",
                          "a" * 5000, tmp_path / "new\nline")
    assert status == 2 and len(lines) == 7
    assert all("unreadable: file: expected a re" in line for line in lines)


def test_names_that_are_not_text(tmp_path: Path) -> None:
    path = os.fsencode(tmp_path) + b"/\xff\xfe.json"
    Path(os.fsdecode(path)).write_text("{}")
    status, lines = check(os.fsdecode(path))
    assert status == 2 and len(lines) == 1 and lines[0].isascii()


@pytest.mark.parametrize(("start", "repeat", "end", "word"), [
    ("", "[", "", "incomplete"), ("", '{"a":', "1", "incomplete"),
    ("[", "[],", "[]]", "incomplete"), ("[", "{},", "1]", "incomplete"),
    ("[", "1,", "1]", "incomplete"), ('"', '\\"', "", "malformed"),
    ('"', '\\"', "\\", "malformed"), ("", '"', "", "malformed"), ("", '"" ', "", "malformed"),
    ("", " ", "", "malformed"), ("1", "1", "1", "incomplete"), ("", "\x00", "", "malformed"),
    ('"', "\u20ac", '"', "malformed"), ("", "]", "", "malformed"),
    ("[", '["a"],', "1]", "incomplete"), ('{"format":"', "a", '"}', "malformed"),
    ("", "\\", "", "malformed"), ("[", '{"a":1},', "1]", "incomplete"),
    ("0.", "1", "", "malformed")])
def test_long_files(tmp_path: Path, start: str, repeat: str, end: str, word: str) -> None:
    count = min(25_000_000 // len(repeat.encode()), 5_000_000)
    assert verdict(tmp_path, start + repeat * count + end).startswith(word)


def test_a_file_that_is_too_long(tmp_path: Path) -> None:
    assert verdict(tmp_path, b" " * (64 * 2**20 + 1)).startswith("incomplete: size limit: file")


def test_objects_just_below_the_limit_of_entries(tmp_path: Path) -> None:
    line = verdict(tmp_path, "[" + '{"a":[]},' * 1_300_000 + "1]")
    assert line == "malformed: file: expected an object, got a list of 1300001"


@pytest.mark.parametrize("rate", [
    "(" * 100_000, "(" * 50_000 + "k" + ")" * 49_999, "9**9**9", "9**9**9**9**9", "-" * 99_999,
    "exp(exp(exp(k)))", "exp(" * 30_000, "1" * 99_999, "1e999999999", "1e-999999999",
    "k" + "*k" * 40_000, "((k + 1)**64)**64", "(((k + 1)**64)**64)**64", "exp(10**15*ln(k + 1))",
    "1" + "+1/k" * 20_000, "k**" * 30_000 + "1", "2**(1/64)**(1/64)", "k" * 99_999,
    "((((k + 1/3)**60)**60)**(1/60))**(1/60)", "exp(ln(k + 1)/10**300)",
    "ln(" * 59 + "k" + ")" * 59,
    "\u0661", "k\u00b2", "k;import os", "().__class__", "k[0]", "lambda: 1", "{}", "'", "\x00"])
def test_expressions(tmp_path: Path, rate: str) -> None:
    line = verdict(tmp_path, with_rate(rate))
    assert line.split(":")[0] in ("malformed", "invalid", "incomplete")


def test_long_sums_are_evaluated(tmp_path: Path) -> None:
    assert verdict(tmp_path, with_rate("4*k" + "+k-k" * 20_000)).startswith("valid")


def test_numbers_of_a_million_digits(tmp_path: Path) -> None:
    text = json.dumps(examples()["pair"])
    for old, new in (('"3/5"', '"{}"'), ('"3/5"', '"1/{}"'), ('"holds": 3', '"holds": {}'),
                     ('"k": "2"', '"k": "{}"')):
        assert old in text
        line = verdict(tmp_path, text.replace(old, new.format("7" * 10**6), 1))
        assert line.startswith("incomplete: size limit")


def test_numbers_just_below_the_limit(tmp_path: Path) -> None:
    record: dict[str, Any] = json.loads(json.dumps(examples()["square-splitting"]))
    record["points"] = [{"x": "1/" + "7" * 6_000, "y": "9" * 20_000}]
    record["sampling"]["count"] = 1
    for claim in record["claims"]:
        claim["holds"] = 1
    line = verdict(tmp_path, json.dumps(record))
    assert line.startswith(("incomplete", "invalid", "malformed"))


def test_many_points_end(tmp_path: Path) -> None:
    record: dict[str, Any] = json.loads(json.dumps(examples()["pair"]))
    record["points"] = [{"k": "1"}] * 200_001
    assert verdict(tmp_path, json.dumps(record)).startswith("incomplete: size limit: points")
    record["points"] = [{"k": "1"}] * 3_000
    for claim in record["claims"]:
        claim["holds"] = 3_000
    assert verdict(tmp_path, json.dumps(record)) .startswith("valid (2 claims, 3000 points): d ")


def test_largest_networks_end(tmp_path: Path) -> None:
    record: dict[str, Any] = json.loads(json.dumps(examples()["pair"]))
    states = [f"S{i}" for i in range(32)]
    record["network"]["states"] = states
    record["network"]["transitions"] = [
        {"name": f"t{e}", "between": [states[e % 32], states[(e + 1 + e // 32) % 32]],
         "forward": f"k/{e + 3}", "backward": f"{e + 2}"} for e in range(128)]
    record["target"] = {"kind": "mean", "above": dict.fromkeys(states, "0") | {"S0": "1"},
                        "below": None}
    record["perturbation"] = {"kind": "barrier", "transition": "t0"}
    for name, end in (("barrier", "incomplete"), ("splitting-end-pair", "incomplete"),
                      ("end-pair", "invalid")):
        record["claims"] = [{**record["claims"][0], "name": name}]
        assert verdict(tmp_path, json.dumps(record)).startswith(end)


def test_damaged_files_have_a_verdict(tmp_path: Path) -> None:
    source = random.Random(11)
    corpus = [path.read_bytes() for path in (Path(__file__).parent / "checker_corpus").glob("*/*")]
    corpus = sorted(data for data in corpus if 50 < len(data) < 8000)
    pieces = [b'"', b"0", b"/", b"**", b"(", b")", b"null", b"{}", b"[]", b",", b"ln(", b"exp(",
              b"e9", b"k", b"true", b"\\u0000", b"\xff", b"99", b"sqrt(", b"*ln(2)"]
    for _ in range(1500):
        data = bytearray(source.choice(corpus))
        for _ in range(source.randint(1, 3)):
            at = source.randrange(len(data))
            data[at : at + source.randint(0, 3)] = source.choice(pieces)
        path = tmp_path / "record.json"
        path.write_bytes(data)
        found = str(check_file(path))
        assert found.isprintable() and len(found) < 2000
