"""Which inequalities get a proof, and that false or unfit ones never do."""

from __future__ import annotations

import json
from collections import Counter
from dataclasses import replace
from pathlib import Path

import pytest

from symbolic_response.bounds.claim import Claim, CycleMaximum, Term
from symbolic_response.bounds.curves import Tanh
from symbolic_response.bounds.registry import NAMES, claims_for
from symbolic_response.certificates.certify import certify
from symbolic_response.certificates.proofs.prove import Proved, prove
from symbolic_response.certificates.proofs.record import kind_of
from symbolic_response.certificates.record import record_of, record_text
from symbolic_response.certificates.report import certificate_text
from symbolic_response.checker import check_record
from symbolic_response.cli import run
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.tree import ONE, divide
from symbolic_response.network import Barrier, Network, Rates, build_network, read_network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from tests.benchmarks.networks import square_with_chord

RATIO = "d ln(p[s1]/p[s2]) / d barrier[e1_2]"


def proved(network: Network, text: str, *claims: Claim) -> Proved:
    analysis = Analysis(network)
    quantity = read_quantity(text, network)
    return prove(analysis, quantity, claims or claims_for(quantity, analysis))


def test_what_a_barrier_needs() -> None:
    found = proved(square_with_chord(), "d p[s1] / d barrier[e1_2]")
    assert not found.without
    needs = {claim.name: [kind_of(proof) for proof in proofs]
             for claim, proofs in zip(found.claims, found.needs, strict=True)}
    assert needs == {"splitting-end-pair": ["edge", "splitting"], "end-pair": ["edge"],
                     "splitting-barrier": ["edge", "splitting"], "barrier": ["edge"]}
    assert Counter(map(kind_of, found.proofs)) == {"edge": 1, "splitting": 1}  # each once


@pytest.mark.parametrize("divisor", [5, 3])
def test_another_divisor_is_never_proved(divisor: int) -> None:
    """tanh(F/5) is false, tanh(F/3) true but no theorem here: neither gets a certificate."""
    analysis = Analysis(square_with_chord())
    (claim,) = claims_for(read_quantity(RATIO, analysis.network), analysis, "barrier")
    (term,) = claim.right
    other = replace(claim, right=(replace(term, curve=Tanh(divisor)),))
    found = proved(analysis.network, RATIO, other)
    assert not found.claims and not found.proofs
    ((_, why),) = found.without
    assert "not an inequality of the catalogue" in why


def test_false_statements_about_currents_are_never_proved() -> None:
    """|d J_a/d J_e| <= 1 and |d ln tau_e/d barrier[e]| <= 1 (both false: see mutual linearity,
    Harunari et al., Phys. Rev. Lett. 133, 047401 (2024), for the slope dJ_a/dJ_e)."""
    network = square_with_chord()
    analysis = Analysis(network)
    slope = divide(read_quantity("d current[e2_3] / d barrier[e1_2]", network),
                   read_quantity("d current[e1_2] / d barrier[e1_2]", network))
    traffic = read_quantity("d ln traffic[e1_2] / d barrier[e1_2]", network)
    for left in (slope, traffic):
        for name in ("current-range", "barrier"):
            claim = Claim(name, left, (Term(ONE),), {}, "", "")
            assert not prove(analysis, left, [claim]).claims
        with pytest.raises(QuantityError):
            claims_for(left, analysis)
    shorter = Claim("barrier", read_quantity(RATIO, network),
                    (Term(ONE, CycleMaximum(1)),), {}, "", "")  # the cycles of another transition
    assert not proved(network, RATIO, shorter).claims


def ring(rate: str, **observables: dict[str, str]) -> Network:
    return build_network("ring", states="A B C", transitions=[
        Rates("A", "B", rate, "k", name="ab"), Rates("B", "C", "m", "2", name="bc"),
        Rates("C", "A", "m", "k", name="ca")], observables=observables)


@pytest.mark.parametrize(("network", "text", "why"), [
    (ring("k*c - m"), "d p[A] / d barrier[ab]", "need not be positive"),
    (ring("k*(1 + c)"), "d p[A] / d ln c", "does not change by a constant factor with c"),
    (ring("k*c", q={"A": "(c + 1)*(c - 1) + 1 + c", "B": "1"}), "d ln mean[q] / d barrier[ab]",
     "not negative"),
])
def test_the_reason_is_given(network: Network, text: str, why: str) -> None:
    analysis = Analysis(network)
    quantity = read_quantity(text, network)
    found = prove(analysis, quantity, claims_for(quantity, analysis))
    assert not found.claims and all(why in reason for _, reason in found.without)


def test_pieces_alone_are_a_proof() -> None:
    """Energies and single rates need no data: the record holds no proofs and is valid."""
    analysis = Analysis(read_network(TIDE))
    made = certify(analysis, "d mean[brightness] / d ln c", only="parameter", method="proof")
    record = record_of(made, analysis)
    assert record["proofs"] == [] and check_record(record).status == "valid"


def test_amounts_that_are_not_real_are_not_proved() -> None:
    network = ring("k*c")
    for amount, real in (("ln(k - c)", False), ("sqrt(k - c)", False), ("ln(k)", True)):
        analysis = Analysis(network)
        text = f"change(ln(p[A]/p[B]), barrier[ab], {amount})"
        made = certify(analysis, text, method="proof")
        assert bool(made.proved.claims) == real
        if real:
            record = record_of(made, analysis)
            assert check_record(record).status == "valid"
            record["perturbation"]["amount"] = "ln(k - c)"  # type: ignore[index]
            assert check_record(record).status == "invalid"
            record["perturbation"]["amount"] = "1/0"  # type: ignore[index]
            assert check_record(record).status == "invalid"


def test_logarithms_of_symbols_in_energies() -> None:
    network = build_network("pump", states={"A": {"energy": "ln(c) + E"}, "B": {"energy": "E"}},
                            symbols={"E": "real", "B1": "real", "c": "positive",
                                     "k": "positive", "m": "positive"}, transitions=[
        Barrier("A", "B", "B1", "ln(k)", name="one"), Rates("A", "B", "k", "m", name="two")])
    for text in ("d p[A] / d ln c", "d p[A] / d ln k"):
        analysis = Analysis(network)
        made = certify(analysis, text, method="proof")
        assert not made.without
        assert check_record(json.loads(record_text(record_of(made, analysis)))).status == "valid"


def test_methods() -> None:
    network = ring("k*(1 + c)")
    text = "d p[A] / d ln c"
    strongest = certify(network, text, count=5, workers=1)
    assert strongest.points is not None and not strongest.without
    only = certify(network, text, method="proof")
    assert only.points is None and len(only.without) == len(strongest.points.claims)
    with pytest.raises(QuantityError, match="nothing was certified"):
        record_of(only, Analysis(network))
    assert certify(network, "d p[A] / d barrier[ab]", count=5).points is None
    with pytest.raises(QuantityError, match="there is no method"):
        certify(network, text, method="guess")


TIDE = str(Path(__file__).parent.parent / "worked_cases" / "tide_lamp" / "network.toml")


def test_the_command_proves(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    file = tmp_path / "record.json"
    asked = "d p[lit] / d barrier[fade]"
    assert run(["certify", TIDE, asked, "-o", str(file), "--quiet"]) == 0
    lines = capsys.readouterr().out.splitlines()
    assert lines[0].split() == ["bound", "proved", "by"]
    assert lines[1].split(maxsplit=1) == ["splitting-end-pair",
                                          "edge fade (expanded), splitting fade (expanded)"]
    assert lines[-2:] == ["each holds for all positive rates of the network", f"written: {file}"]
    assert run(["recheck", str(file)]) == 0
    assert "for all positive rates" in capsys.readouterr().out
    assert run(["certify", TIDE, asked, "--proof-only", "--json", "--quiet"]) == 0
    data = json.loads(capsys.readouterr().out)
    assert data["points"] is None and data["bounds"] == [] and data["not_certified"] == []
    assert [entry["name"] for entry in data["proved"]] == [
        "splitting-end-pair", "end-pair", "splitting-barrier", "barrier"]
    assert data["proved"][1]["proofs"] == [{"kind": "edge", "form": "expanded", "subject": "fade"}]


def test_what_has_no_proof_is_undecided(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    net, file = tmp_path / "net.toml", tmp_path / "record.json"
    net.write_text('title = "t"\n[symbols.a]\n[symbols.b]\n[states.A]\n[states.B]\n'
                   '[[transitions]]\nname = "e"\nbetween = ["A", "B"]\n'
                   'rates = ["a + b - a*b/2000", "1"]\n', encoding="utf-8")
    asked = ["certify", str(net), "d p[A] / d energy[A]", "--quiet", "-o", str(file)]
    assert run([*asked, "--proof-only"]) == 3
    assert "not certified: energy-range: a rate of transition 'e' need not be positive" in (
        capsys.readouterr().out)
    assert not file.exists()
    assert run([*asked, "--points", "3"]) == 0
    assert json.loads(file.read_text(encoding="utf-8"))["kind"] == "points"
    assert run(["recheck", str(file)]) == 0


@pytest.mark.parametrize("verb", ["bound", "certify"])
def test_the_help_names_the_whole_catalogue(
    verb: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run([verb, "--help"]) == 0
    listed = capsys.readouterr().out.split("Names:")[1].split("Example:")[0]
    assert [name.strip() for name in listed.replace("\n", " ").split(",")] == list(NAMES)


def test_the_network_file_is_never_overwritten(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    for name, verb, output in (
        ("net.toml", ["certify", "d p[lit] / d barrier[fade]"], "net.toml"),
        ("net.tex", ["appendix"], "net.tex"),
        ("net.proofs.json", ["appendix"], "net.tex"),
    ):
        file = tmp_path / name
        file.write_text(Path(TIDE).read_text(encoding="utf-8"), encoding="utf-8")
        arguments = [verb[0], str(file), *verb[1:], "-o", str(tmp_path / output), "--quiet"]
        assert run(arguments) == 2
        assert "is the network file itself; choose another name" in capsys.readouterr().err
        assert file.read_text(encoding="utf-8") == Path(TIDE).read_text(encoding="utf-8")
        file.unlink()


def test_one_kind_at_a_time(capsys: pytest.CaptureFixture[str]) -> None:
    both = ["certify", TIDE, "d p[lit] / d barrier[fade]", "--proof-only", "--points-only"]
    assert run(both) == 2
    assert "exclude each other" in capsys.readouterr().err


def test_points_say_why_there_is_no_proof() -> None:
    made = certify(ring("k*(1 + c)"), "d p[A] / d ln c", count=3, workers=1)
    text = certificate_text(made, None)
    assert ("no proof of parameter: a rate of transition 'ab' does not change by a constant factor"
            " with c") in text
    assert "no proof" not in certificate_text(
        certify(ring("k*c"), "d p[A] / d ln c", method="points", count=3, workers=1), None)
