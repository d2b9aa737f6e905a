"""Certificates: reproducible to the byte, accepted by the independent check, refused when false."""

from __future__ import annotations

import json
import subprocess
import sys
from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace
from fractions import Fraction
from pathlib import Path
from typing import Any

import mpmath
import pytest
from at_points import certify_points

from symbolic_response.bounds import registry
from symbolic_response.bounds.barrier import barrier
from symbolic_response.bounds.claim import Claim, CycleMaximum, Question, Term
from symbolic_response.bounds.curves import Tanh
from symbolic_response.certificates.certify import Certificate, certify
from symbolic_response.certificates.points import PointCertificate, certify_claims
from symbolic_response.certificates.proofs.prove import Proved
from symbolic_response.certificates.record import point_record, record_text, write_certificate
from symbolic_response.certificates.report import certificate_text, ratio_text
from symbolic_response.checker import check_file
from symbolic_response.cli import run
from symbolic_response.errors import (
    AssignmentError,
    EvaluationError,
    OutputError,
    QuantityError,
    UndecidedError,
)
from symbolic_response.expressions.tree import ONE
from symbolic_response.network import Barrier, Network, Rates, build_network, read_network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from tests.benchmarks.networks import square_with_chord

TIDE = Path(__file__).parent.parent / "worked_cases" / "tide_lamp" / "network.toml"
NOTHING = Proved((), (), (), ())
BARRIER = "d ln(p[s1]/p[s2]) / d barrier[e1_2]"


def text_of(made: PointCertificate, analysis: Analysis) -> str:
    return record_text(point_record(made, analysis))


@pytest.mark.parametrize("count", [260])
def test_the_same_seed_gives_the_same_bytes(count: int) -> None:
    network = square_with_chord()
    texts = []
    for workers in (1, 2, 1):
        analysis = Analysis(network)
        made = certify_points(analysis, BARRIER, count=count, workers=workers)
        texts.append(text_of(made, analysis))
    assert texts[0] == texts[1] == texts[2]
    analysis = Analysis(network)
    with ThreadPoolExecutor(1) as executor:
        made = certify_points(analysis, BARRIER, count=count, executor=executor)
        assert executor.submit(int).result() == 0  # left running
    assert text_of(made, analysis) == texts[0]
    other = text_of(certify_points(analysis, BARRIER, count=count, seed="1", workers=1), analysis)
    assert json.loads(other)["points"] != json.loads(texts[0])["points"]


NETWORKS: dict[str, Network] = {
    "tide": read_network(str(TIDE)),
    "energy": build_network("energy", states={"A": "E_A", "B": "0", "C": "0"}, transitions=[
        Barrier("A", "B", "B_1", "F", name="e"), Barrier("B", "C", "B_2", "F/2", name="f"),
        Barrier("C", "A", "0", name="g")]),
    "one-way": build_network("one-way \u00e9", states="A B C", transitions=[
        Rates("A", "B", "sqrt(c)", "k", name="e"), Rates("B", "C", "u", name="f"),
        Rates("C", "A", "k + u", "c**2/(1+c)", name="g"), Rates("A", "C", "c", name="h")]),
    "numbers": build_network("numbers", states="A B", transitions=[
        Rates("A", "B", 4, 1, name="one"), Rates("A", "B", 1, "0.25", name="two")]),
    "uncertain sign": build_network("uncertain sign", states="A B C", transitions=[
        Rates("A", "B", "k*c/(1+c)**2", "c**2", name="e"), Rates("B", "C", "u", "v", name="f"),
        Rates("C", "A", "k", "c*k", name="g")]),
}
CASES = [
    ("tide", "d mean[brightness] / d barrier[fade]"), ("tide", "d mean[brightness] / d ln c"),
    ("tide", "d ln p[lit] / d drive[light]"), ("tide", "d p[lit] / d energy[spent]"),
    ("tide", "d mean[brightness]/p[idle] / d barrier[spend]"), ("tide", "p[lit]/p[idle]"),
    ("tide", "d 1/p[lit] / d b"), ("tide", "ln(p[spent]/p[lit])"),
    ("energy", "d p[A] / d F"), ("energy", "d ln(p[A]/p[B]) / d barrier[e]"),
    ("energy", "d p[B]/p[A] / d energy[A]"), ("energy", "d p[A, B] / d E_A"),
    ("one-way", "d p[A] / d barrier[e]"), ("one-way", "d p[A] / d drive[f]"),
    ("one-way", "d p[A]/p[C] / d c"), ("one-way", "d ln p[B] / d ln u"),
    ("numbers", "d p[A] / d barrier[one]"), ("numbers", "d p[A] / d energy[B]"),
    ("uncertain sign", "d p[A] / d ln c"),
]


@pytest.mark.parametrize(("name", "text"), CASES)
def test_records_pass_the_independent_check(name: str, text: str, tmp_path: Path) -> None:
    analysis = Analysis(NETWORKS[name])
    whole = certify(analysis, text, method="points", count=12, workers=1)
    made = whole.points
    assert made is not None and made.refuted is None and len(made.claims) >= 1
    file = tmp_path / "record.json"
    write_certificate(whole, analysis, file)
    verdict = check_file(str(file))
    assert verdict.status == "valid", str(verdict)
    assert f"{len(made.points)} point" in str(verdict)
    for entry in made.claims:
        assert entry.holds == len(made.points) >= 12


def test_a_changed_record_is_not_accepted(tmp_path: Path) -> None:
    analysis = Analysis(NETWORKS["tide"])
    record: Any = point_record(certify_points(analysis, CASES[0][1], count=6, workers=1), analysis)
    file = tmp_path / "record.json"
    record["claims"][0]["worst"]["left"] = "1"
    file.write_text(record_text(record), encoding="utf-8")
    assert check_file(str(file)).status == "invalid"


def test_the_record_is_as_specified() -> None:
    analysis = Analysis(NETWORKS["energy"])
    made = certify_points(analysis, "d p[A] / d F", count=5, seed="any text", workers=1)
    text = text_of(made, analysis)
    record = json.loads(text)
    assert list(record) == ["format", "version", "kind", "network", "response", "domain", "target",
                            "perturbation", "path", "sampling", "points", "claims"]
    assert record["sampling"] == {"rule": "dyadic-strata-1", "seed": "any text", "count": 5}
    assert record["perturbation"] == {"kind": "symbol", "symbol": "F", "logarithmic": False}
    assert record["target"] == {"kind": "mean", "above": {"A": "1", "B": "0", "C": "0"},
                                "below": None}
    for point in record["points"]:  # the search ends on the same grid of logarithms
        assert list(point) == ["E_A", "B_1", "F", "B_2"]
        assert all(value == "0" or "*ln(" in value for value in point.values())
    lines = text.splitlines()
    assert sum(line.startswith('{"E_A"') for line in lines) == len(record["points"])
    (claim,) = record["claims"]
    assert list(claim) == ["name", "parts", "holds", "worst"]
    assert claim["parts"] == {"energies": {}, "barriers": {}, "singles": {"e": "1", "f": "1/2"}}


def test_the_ratio_is_that_of_the_specification() -> None:
    analysis = Analysis(NETWORKS["tide"])
    made = certify_points(analysis, CASES[0][1], only="barrier", count=9, workers=1)
    record: Any = point_record(made, analysis)
    worst = record["claims"][0]["worst"]
    low = Fraction(0)
    for term in worst["right"]:
        g = Fraction(term["g"])
        a, b = g.numerator, g.denominator
        with mpmath.workprec(2000):
            floor = int(mpmath.floor(mpmath.sqrt(mpmath.mpf(a) * b) * mpmath.mpf(2) ** 128))
        root = Fraction(floor, b << 128)
        low += Fraction(term["factor"]) * (root - 1) / (root + 1)
    assert Fraction(worst["ratio"]) == Fraction(worst["left"]) / low


# -- refutation ------------------------------------------------------------------------------


def false_barrier(question: Question) -> Claim | None:
    claim = barrier(question)
    if claim is None:
        return None
    (term,) = claim.right
    assert isinstance(term.force, CycleMaximum)
    return replace(claim, right=(replace(term, curve=Tanh(5)),))


def test_a_refuted_claim_has_no_certificate(tmp_path: Path) -> None:
    analysis = Analysis(square_with_chord())
    quantity = read_quantity(BARRIER, analysis.network)
    claim = Claim("false", quantity, (Term(ONE, CycleMaximum(0), Tanh(5)),), {}, "", "")
    made = certify_claims(analysis, quantity, [claim], text=BARRIER, count=300, workers=2)
    serial = certify_claims(analysis, quantity, [claim], text=BARRIER, count=300, workers=1)
    assert made.refuted is not None and made.refuted == serial.refuted
    assert "\n" not in made.refuted.message()
    file = tmp_path / "record.json"
    with pytest.raises(QuantityError, match="false is refuted at W_1_2 = "):
        write_certificate(Certificate(analysis.network, BARRIER, quantity, NOTHING, made), analysis,
                          file)
    assert list(tmp_path.iterdir()) == []


def test_the_command_reports_a_refutation(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(registry.CATALOGUE, "barrier", false_barrier)
    file = tmp_path / "record.json"
    status = run(["certify", str(TIDE), "d ln(p[idle]/p[lit]) / d barrier[fade]", "--bound",
                  "barrier", "--points-only", "--points", "50", "--workers", "1", "-o", str(file),
                  "--json"])
    shown = capsys.readouterr()
    assert status == 1 and not file.exists()
    data = json.loads(shown.out)
    assert data["bounds"] == [] and data["file"] is None
    assert data["refuted"]["name"] == "barrier" and set(data["refuted"]["at"]) >= {"c", "a"}
    (line,) = shown.err.strip().splitlines()
    assert line.startswith("error: barrier is refuted at c = ")


# -- the command ---------------------------------------------------------------------------


def test_the_table(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    file = tmp_path / "record.json"
    status = run(["certify", str(TIDE), CASES[0][1], "--points-only", "--points", "20", "-o",
                  str(file), "--quiet", "--workers", "1", "--seed", "x"])
    shown = capsys.readouterr()
    assert status == 0 and shown.err == ""
    lines = shown.out.splitlines()
    assert lines[0].split() == ["bound", "points", "largest", "ratio", "where"]
    assert [line.split()[0] for line in lines[1:5]] == [
        "splitting-end-pair", "end-pair", "splitting-barrier", "barrier"]
    assert lines[-1] == f"written: {file}"
    record = json.loads(file.read_text(encoding="utf-8"))
    for line, claim in zip(lines[1:5], record["claims"], strict=True):
        ratio, shown_ratio = Fraction(claim["worst"]["ratio"]), Fraction(line.split()[2])
        assert 0 <= ratio - shown_ratio < Fraction(1, 10**8)
    assert run(["recheck", str(file)]) == 0
    assert list(tmp_path.iterdir()) == [file]


def test_without_a_file_nothing_is_written(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    assert run(["certify", str(TIDE), CASES[1][1], "--points-only", "--points", "5", "--json"]) == 0
    data = json.loads(capsys.readouterr().out)
    names = [entry["name"] for entry in data["bounds"]]
    assert names == ["parameter", "directed-bundle", "support"]
    assert data["refuted"] is None and data["file"] is None and data["count"] == 5
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(("text", "more", "status", "said"), [
    ("d p[lit] / d barrier[fade]", ["--bound", "barrir"], 2, "did you mean 'barrier'"),
    ("d p[lit] / d barrier[fade]", ["--bound", "drive"], 2, "does not apply"),
    ("d current[light] / d barrier[fade]", [], 2, "no bound of the catalogue applies"),
    ("d p[lit] / d barrier[fade]", ["-o", "missing/file.json"], 2, "no folder"),
    ("d p[lit] / d barrier[fade]", ["-o", "."], 2, "is a folder"),
    ("d p[lit] / d barrier[fade]", ["--points", "0"], 2, "--points"),
    ("d p[lit] / d barrier[fade]", ["--seed", "\udc80"], 2, "seed"),
])
def test_faults_are_one_line(
    text: str, more: list[str], status: int, said: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(["certify", str(TIDE), text, "--points-only", "--points", "5", "--quiet",
                *more]) == status
    shown = capsys.readouterr()
    assert shown.out == ""
    (line,) = shown.err.strip().splitlines()
    assert said in line


def test_undecided_exits_3(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    file = tmp_path / "net.toml"
    file.write_text('title = "t"\n[symbols.F]\nsign = "real"\n[states.A]\n[states.B]\n'
                    '[[transitions]]\nname = "e"\nbetween = ["A", "B"]\n'
                    'rates = ["exp(F)", "F**2 + 1"]\n', encoding="utf-8")
    assert run(["certify", str(file), "d p[A] / d barrier[e]", "--points-only", "--quiet"]) == 3
    assert "inside and outside exponents" in capsys.readouterr().err


def test_errors_from_python() -> None:
    analysis = Analysis(NETWORKS["tide"])
    with pytest.raises(AssignmentError):
        certify_points(analysis, CASES[0][1], seed="\ud800", count=1)
    never = build_network("never", states="A B", transitions=[("A", "B", "k1 - k2", "k2", "e")],
                          symbols={"k1": {"range": ["1", "2"]}, "k2": {"range": ["3", "4"]}})
    with pytest.raises(EvaluationError, match="200 draws"):
        certify_points(Analysis(never), "d p[A] / d energy[A]", count=300, workers=2)
    inside = build_network("inside", states="A B", transitions=[("A", "B", "exp(F)", "1", "e")],
                           symbols={"F": "real"}, observables={"q": {"A": "F**2"}})
    with pytest.raises(UndecidedError, match="inside and outside"):
        certify_points(Analysis(inside), "d mean[q] / d barrier[e]", count=1)
    assert certify_points(Analysis(inside), "d p[A] / d energy[A]", count=1).refuted is None
    with pytest.raises(OutputError):
        write_certificate(certify(analysis, CASES[0][1]), analysis, "/no/such/folder/file.json")


def test_the_inverse_of_a_one_way_path() -> None:
    network = build_network("one-way", states="A B", transitions=[
        Rates("A", "B", "c", name="e"), Rates("A", "B", "k", "u", name="f")])
    analysis = Analysis(network)
    assert certify_points(analysis, "p[A]/p[B]", count=3, workers=1).claims[0].claim.name == "path"
    with pytest.raises(QuantityError, match="inverse"):
        certify_points(analysis, "p[B]/p[A]", count=3, workers=1)


def test_ratios_are_rounded_down() -> None:
    assert ratio_text(Fraction(1) - Fraction(1, 10**12)) == "0.99999999"
    assert ratio_text(Fraction(1)) == "1.00000000"
    analysis = Analysis(NETWORKS["numbers"])
    made = certify(analysis, "d p[A] / d energy[B]", method="points", count=1, workers=1)
    assert "the only point" in certificate_text(made, None)


def test_a_script_needs_no_guard(tmp_path: Path) -> None:
    script = tmp_path / "script.py"
    script.write_text(
        "import symbolic_response as sr\n"
        "net = sr.build_network('pair', states='A B', transitions=[('A', 'B', 'k*c', 'k', 'e'),"
        " ('A', 'B', 'u', 'c', 'f')])\n"
        "print(sr.certify(sr.Analysis(net), 'd p[A] / d barrier[e]', method='points', count=300,"
        " workers=2).points.claims[0].holds)\n", encoding="utf-8")
    done = subprocess.run([sys.executable, str(script)], capture_output=True, text=True,
                          check=False, timeout=120)
    assert done.returncode == 0 and int(done.stdout) >= 300, done.stderr
