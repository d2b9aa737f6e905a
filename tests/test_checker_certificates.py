"""Records that the package writes are valid for the checker, which shares no code with it."""

from __future__ import annotations

import copy
import json
from pathlib import Path
from typing import Any

import pytest
from at_points import certify_points

import symbolic_response as sr
from symbolic_response.certificates.record import point_record, record_text
from symbolic_response.checker import check_record

CASES = Path(__file__).parent.parent / "worked_cases"
ASKED = [
    ("tide_lamp", "d mean[brightness] / d ln c", ["parameter", "directed-bundle", "support"]),
    ("tide_lamp", "d mean[brightness] / d barrier[fade]",
     ["splitting-end-pair", "end-pair", "splitting-barrier", "barrier"]),
    ("tide_lamp", "d ln(p[idle]/p[spent]) / d barrier[light]", ["end-pair", "barrier"]),
    ("turnstile", "d ln mean[occupied] / d drive[turn]", ["splitting-drive", "drive"]),
    ("turnstile", "d mean[occupied]/p[turned] / d energy[loaded]", ["energy-range"]),
    ("turnstile", "ln(p[open]/p[turned])", ["path"]),
    ("stamp_press", "d p[loaded] / d ln s", ["parameter", "directed-bundle", "support"]),
    ("stamp_press", "d p[loaded] / d barrier[eject]",
     ["splitting-end-pair", "end-pair", "splitting-barrier", "barrier"]),
]


def written(case: str, asked: str) -> Any:
    analysis = sr.Analysis(sr.read_network(CASES / case / "network.toml"))
    certificate = certify_points(analysis, asked, count=12, workers=1)
    return json.loads(record_text(point_record(certificate, analysis)))


@pytest.mark.parametrize(("case", "asked", "names"), ASKED)
def test_written_records_are_valid(case: str, asked: str, names: list[str]) -> None:
    record = written(case, asked)
    assert check_record(record).status == "valid"
    assert [claim["name"] for claim in record["claims"]] == names
    broken = copy.deepcopy(record)
    broken["network"]["transitions"][0]["forward"] += " + 1"
    assert check_record(broken).status == "invalid"


def test_energies_and_drives_in_exponents() -> None:
    network = sr.read_network(CASES / "twin_ferry" / "network.toml")
    real = [entry.name for entry in network.symbols if not entry.positive]
    first, second = network.states[0].name, network.states[1].name
    edge = network.transitions[0].name
    asked = [f"d ln(p[{first}]/p[{second}]) / d {name}" for name in real]
    asked += [f"d p[{first}] / d barrier[{edge}]", f"p[{first}]/p[{second}]"]
    assert real
    for text in asked:
        record = written("twin_ferry", text)
        assert check_record(record).status == "valid", text
        assert any("*ln(" in value for point in record["points"] for value in point.values())
