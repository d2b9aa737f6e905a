"""Committed proofs: what is written today, byte by byte, and valid for the checker by itself.

``python -m tests.test_proof_records`` writes them anew after a change of the format.
"""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

import symbolic_response
from symbolic_response.certificates.certify import certify
from symbolic_response.certificates.record import record_of, record_text
from symbolic_response.network import Network
from symbolic_response.response.analysis import Analysis
from tests.benchmarks.networks import complete, square_with_chord
from tests.benchmarks.proofs import one_way_ring, ring, two_channels

FOLDER = Path(__file__).parent / "proof_records"
CHECKER = Path(symbolic_response.__file__).parent / "checker"
ASKED: dict[str, tuple[Network, str]] = {
    "barrier-square": (square_with_chord(), "d p[s1] / d barrier[e1_3]"),
    "barrier-ratio-channels": (two_channels(), "d ln(p[s1]/p[s3]) / d barrier[f1_2]"),
    "barrier-one-way": (one_way_ring(), "d p[s2]/p[s3] / d barrier[e4_1]"),
    "barrier-compact": (complete(6), "d p[s1, s2] / d barrier[e1_2]"),
    "drive-square": (square_with_chord(), "d p[s1] / d drive[e1_3]"),
    "energy-ring": (ring(3), "d p[s1] / d energy[s2]"),
    "current-channels": (two_channels(), "d current[e1_2] / d drive[e1_2]"),
    "second-order-ring": (ring(4),
                          "d (d ln(p[s1]/p[s3]) / d barrier[e1_2]) / d barrier[e1_2]"),
    "finite-square": (square_with_chord(), "change(ln(p[s1]/p[s2]), barrier[e1_3], 2*ln(3/2))"),
    "one-rate-square": (square_with_chord(), "d p[s1] / d ln W_2_1"),
    "bundle-ring": (ring(4), "d ln(p[s1]/p[s2]) / d barrier[e1_2, e3_4]"),
    "path-square": (square_with_chord(), "p[s1]/p[s3]"),
}


def written(name: str) -> str:
    network, asked = ASKED[name]
    analysis = Analysis(network)
    made = certify(analysis, asked, method="proof")
    assert not made.without
    return record_text(record_of(made, analysis))


@pytest.mark.parametrize("name", ASKED)
def test_the_committed_record_is_what_is_written(name: str) -> None:
    assert (FOLDER / f"{name}.json").read_text(encoding="utf-8") == written(name)


def test_all_are_valid_for_the_checker_by_itself() -> None:
    files = sorted(FOLDER.glob("*.json"))
    assert [file.stem for file in files] == sorted(ASKED)
    done = subprocess.run([sys.executable, "-I", "-S", str(CHECKER), *map(str, files)],
                          capture_output=True, text=True, check=False, cwd="/")
    assert done.returncode == 0 and done.stderr == ""
    lines = done.stdout.splitlines()
    assert len(lines) == len(files)
    assert all(": valid (proof for all positive rates" in line for line in lines)
    assert sum("2^61-1" in line for line in lines) == 1  # the compact one says so


if __name__ == "__main__":
    for each in ASKED:
        (FOLDER / f"{each}.json").write_text(written(each), encoding="utf-8")
