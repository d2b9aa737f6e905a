"""The appendix with bounds and a table of certificates: what it states, and that it compiles."""

import re
from pathlib import Path

import pytest

from symbolic_response.appendix import appendix_text
from symbolic_response.errors import NetworkError
from symbolic_response.network import Network, Rates, build_network


def ring(**appendix: object) -> Network:
    return build_network("ring", states="A B C", transitions=[
        Rates("A", "B", "a*c", "b", name="bind"), Rates("B", "C", "e", "f", name="flip"),
        Rates("C", "A", "g", name="reset")],
        observables={"q": {"B": 2, "C": -1}},
        sections={"appendix": {"quantities": [
            "d p[A] / d barrier[bind]", "d mean[q] / d barrier[flip]", "d mean[q] / d ln c",
            "d p[A] / d energy[B]", "ln(p[A]/p[B])", "current[flip]"], **appendix}})


def test_bounds_are_stated_with_their_sources_and_nothing_else() -> None:
    text = appendix_text(ring())
    body, bibliography = text.split(r"\begin{thebibliography}")
    cited = {key for group in re.findall(r"\\cite\{([^}]*)\}", body) for key in group.split(",")}
    listed = set(re.findall(r"\\bibitem\{([^}]*)\}", bibliography))
    assert cited == listed and {"owen", "martins", "support"} <= listed
    assert r"\section{Bounds on the responses}" in body
    assert r"\section{Certificates}" not in body
    assert r"\le" in body and r"\mathrm{Cov}(1_{A}, 1_S)" in body


def test_bounds_can_be_left_out() -> None:
    assert r"\section{Bounds" not in appendix_text(ring(bounds=False))


def test_certificates_and_digests() -> None:
    text = appendix_text(ring(certificates=20, digests=True))
    table = text.split(r"\section{Certificates}")[1]
    assert "20 sampled points" in table
    whole = table.replace(r"}\allowbreak{}\texttt{", "")
    digests = re.findall(r"\\texttt\{([0-9a-f]{64})\}", whole)
    assert len(digests) == 5 and len(set(digests)) == 5
    assert appendix_text(ring(certificates=20, digests=True)) == text  # the same every time
    ratios = [float(x) for x in re.findall(r"& ([01]\.[0-9]{8})", table)]
    assert ratios and all(0 <= ratio <= 1 for ratio in ratios)


@pytest.mark.parametrize(("key", "value"), [
    ("bounds", 1), ("digests", "yes"), ("certificates", -1), ("certificates", True),
    ("certificates", "1000"), ("certificates", 10**6), ("certificate", 3),
])
def test_faulty_entries(key: str, value: object) -> None:
    with pytest.raises(NetworkError, match=rf"\[appendix\].*{key}"):
        appendix_text(ring(**{key: value}))


@pytest.mark.usefixtures("requires_latex")
def test_it_compiles(tmp_path: Path) -> None:
    import subprocess

    target = tmp_path / "ring.tex"
    target.write_text(appendix_text(ring(certificates=20, digests=True)), encoding="ascii")
    for _ in range(2):
        subprocess.run(["pdflatex", "-interaction=nonstopmode", "-halt-on-error", target.name],
                       cwd=tmp_path, check=True, capture_output=True, timeout=120)
    log = (tmp_path / "ring.log").read_text(encoding="latin-1")
    assert "Overfull" not in log and "undefined" not in log
