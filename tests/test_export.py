"""Exported functions and data against a solver of the test's own.

The oracle: Gaussian elimination on fractions (common practice, no source), rates by evaluating
their texts with Python, derivatives from W p' = -W' p; floats by numpy.linalg.
"""

from __future__ import annotations

import json
import math
import random
import subprocess
import sys
from collections.abc import Callable, Mapping
from fractions import Fraction
from pathlib import Path
from types import ModuleType
from typing import Any

import numpy as np
import pytest

from symbolic_response.errors import (
    EvaluationError,
    NetworkError,
    OutputError,
    QuantityError,
    SizeLimitError,
)
from symbolic_response.export import (
    export_files,
    export_functions,
    export_json,
    formulas,
    functions_text,
    json_text,
    program,
)
from symbolic_response.export.names import argument_names, function_names
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.text import expression_text
from symbolic_response.network import Barrier, Network, Rates, build_network, read_network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.deriving import derive

CASES = sorted((Path(__file__).parent.parent / "worked_cases").glob("*/network.toml"))
Exact = dict[str, Fraction]

# -- networks ------------------------------------------------------------------------------------

MILL = [("wet", "A", "B", "k*c", "u"), ("grind", "B", "C", "2*k/3", "u + v"),
        ("drop", "C", "A", "v", "c/(k + 1)"), ("leak", "A", "C", "u*v", None),
        ("store", "C", "D", "v**2", "k")]
MILL_QUANTITIES = ["p[A, C]", "mean[load]", "current[wet]", "traffic[grind]", "current[drop]/p[B]",
                   "d mean[load] / d ln c", "d p[C] / d v", "d p[B] / d barrier[grind]",
                   "d current[wet] / d drive[drop]", "d mean[load] / d energy[B]",
                   "d p[A] / d barrier[wet, drop]", "change(p[A], barrier[wet], ln(2))", "1/2"]


def mill() -> Network:
    return build_network(
        "mill", states="A B C D",
        transitions=[Rates(a, b, w, v, name=name) for name, a, b, w, v in MILL],
        observables={"load": {"A": "1/3", "B": "c", "D": "-2"}})


def awkward() -> Network:
    return build_network(
        'a """ \\ >>> raise SystemExit', states=["I", "np", "lambda"],
        transitions=[Rates("I", "np", "lambda*None", "I*exp(math)", name="in"),
                     Rates("np", "lambda", "np + numpy", "sqrt(Fraction)", name="None"),
                     Rates("lambda", "I", "in*D/x1", "N_I*e", name="def")],
        symbols={**{name: {} for name in ("None", "I", "np", "numpy", "Fraction", "in", "D", "x1",
                                          "N_I", "e", "float")},
                 "lambda_": {"latex": "l"},
                 "math": {"sign": "real", "about": 'ends """ here\\'},
                 "lambda": {"about": ">>> raise SystemExit"}},
        observables={"print": {"I": "lambda_", "np": "float"}})


def hinge() -> Network:
    return build_network(
        "hinge", states={"A": "E_A", "B": "E_B", "C": "0"},
        transitions=[Barrier("A", "B", "B1", "F", name="one"), Barrier("B", "C", "B2", name="two"),
                     Barrier("C", "A", "0", "F/3", name="three"),
                     Barrier("A", "B", "B1/2", name="slip")],
        symbols={name: {"sign": "real"} for name in ("E_A", "E_B", "B1", "B2", "F")},
        observables={"depth": {"A": "E_A", "B": "E_B"}})


def complete(size: int) -> Network:
    return build_network(
        f"complete {size}", states=[f"s{k}" for k in range(size)],
        transitions=[Rates(f"s{a}", f"s{b}", f"k{a}_{b}*c" if a == 0 else f"k{a}_{b}",
                           f"k{b}_{a}", name=f"t{a}_{b}")
                     for b in range(size) for a in range(b)])


# -- the oracle ----------------------------------------------------------------------------------


def solved(matrix: list[list[Fraction]], right: list[Fraction]) -> list[Fraction]:
    rows = [[*row, value] for row, value in zip(matrix, right, strict=True)]
    for place in range(len(rows)):
        pivot = next(i for i in range(place, len(rows)) if rows[i][place] != 0)
        rows[place], rows[pivot] = rows[pivot], rows[place]
        rows[place] = [x / rows[place][place] for x in rows[place]]
        for i, row in enumerate(rows):
            if i != place and row[place] != 0:
                rows[i] = [x - row[place] * y for x, y in zip(row, rows[place], strict=True)]
    return [row[-1] for row in rows]


def steady(size: int, flows: list[tuple[int, int, Fraction]]) -> list[Fraction]:
    """Return p for flows (from, to, rate)."""
    matrix = [[Fraction(0)] * size for _ in range(size)]
    for tail, head, rate in flows:
        matrix[head][tail] += rate
        matrix[tail][tail] -= rate
    matrix[-1] = [Fraction(1)] * size
    return solved(matrix, [Fraction(0)] * (size - 1) + [Fraction(1)])


def changed(size: int, flows: list[tuple[int, int, Fraction]], moves: list[Fraction],
            p: list[Fraction]) -> list[Fraction]:
    """Return p' where each rate changes by so much."""
    matrix = [[Fraction(0)] * size for _ in range(size)]
    right = [Fraction(0)] * size
    for (tail, head, rate), move in zip(flows, moves, strict=True):
        matrix[head][tail] += rate
        matrix[tail][tail] -= rate
        right[head] -= move * p[tail]
        right[tail] += move * p[tail]
    matrix[-1], right[-1] = [Fraction(1)] * size, Fraction(0)
    return solved(matrix, right)


def mill_values(at: Exact) -> dict[str, Fraction]:
    """Return what MILL_QUANTITIES are at a point, derivatives of rates written out by hand."""
    c, k, u, v = (at[name] for name in "ckuv")
    flows, owners = [], []
    for name, a, b, ahead, back in MILL:
        for tail, head, text in ((a, b, ahead), (b, a, back)):
            if text is not None:
                # "2*k/3" and the others, with fractions for the symbols
                flows.append(("ABCD".index(tail), "ABCD".index(head), eval(text, {}, dict(at))))
                owners.append((name, tail == a))
    p = steady(4, flows)
    load = [Fraction(1, 3), c, Fraction(0), Fraction(-2)]
    w = {owner: rate for owner, (_, _, rate) in zip(owners, flows, strict=True)}

    def moved(step: Callable[[tuple[str, bool]], Fraction]) -> list[Fraction]:
        return changed(4, flows, [step(owner) for owner in owners], p)

    def current(name: str, x: list[Fraction]) -> Fraction:
        a, b = next((a, b) for n, a, b, _, _ in MILL if n == name)
        return w[name, True] * x["ABCD".index(a)] - w[name, False] * x["ABCD".index(b)]

    by_c = moved(
        lambda o: {("wet", True): k * c, ("drop", False): c / (k + 1)}.get(o, Fraction(0)))
    by_v = moved(lambda o: {("grind", False): Fraction(1), ("drop", True): Fraction(1),
                            ("leak", True): u, ("store", True): 2 * v}.get(o, Fraction(0)))
    barrier = moved(lambda o: -w[o] if o[0] == "grind" else Fraction(0))
    both = moved(lambda o: -w[o] if o[0] in ("wet", "drop") else Fraction(0))
    drive = moved(lambda o: (w[o] / 2 if o[1] else -w[o] / 2) if o[0] == "drop" else Fraction(0))
    out_of_b = {("wet", False), ("grind", True)}
    energy = moved(lambda o: w[o] if o in out_of_b else Fraction(0))
    raised = steady(4, [(tail, head, rate / 2 if owner[0] == "wet" else rate)
                        for owner, (tail, head, rate) in zip(owners, flows, strict=True)])
    traffic = w["grind", True] * p[1] + w["grind", False] * p[2]
    values = [p[0] + p[2], sum(x * y for x, y in zip(load, p, strict=True)), current("wet", p),
              traffic, current("drop", p) / p[1],
              sum(x * y for x, y in zip(load, by_c, strict=True)) + c * p[1], by_v[2], barrier[1],
              current("wet", drive), sum(x * y for x, y in zip(load, energy, strict=True)), both[0],
              raised[0] - p[0], Fraction(1, 2)]
    return dict(zip(MILL_QUANTITIES, values, strict=True))


def drawn(names: list[str], rng: random.Random) -> Exact:
    return {name: Fraction(rng.randint(1, 40), rng.randint(1, 12)) for name in names}


def module_of(text: str) -> ModuleType:
    made = ModuleType("exported")
    exec(compile(text, "exported.py", "exec"), made.__dict__)
    return made


def called(module: ModuleType, quantity: str, values: Mapping[str, Any]) -> Any:
    return module.FUNCTIONS[quantity](**{module.SYMBOLS[k]: v for k, v in values.items()})


# -- functions -----------------------------------------------------------------------------------


@pytest.mark.parametrize("trees", [True, False], ids=["trees", "elimination"])
def test_values_at_random_points_are_exact(trees: bool, monkeypatch: pytest.MonkeyPatch) -> None:
    if not trees:
        monkeypatch.setattr(formulas, "MAX_TREES", 0)
    text = functions_text(mill(), MILL_QUANTITIES)
    assert ("Found by sums over spanning trees." in text) == trees
    module, rng = module_of(text), random.Random(7)
    for _ in range(6):
        at = drawn(list("ckuv"), rng)
        for quantity, expected in mill_values(at).items():
            found = called(module, quantity, at)
            assert type(found) is Fraction
            assert found == expected, quantity


def test_integers_are_exact_and_rates_and_states_are_named() -> None:
    module = module_of(functions_text(mill(), []))
    assert module.rates(c=2, k=3, u=1, v=5)["drop"] == (5, Fraction(1, 2))
    assert module.rates(c=2, k=3, u=1, v=5)["leak"] == (5, 0)
    p = module.steady_state(c=2, k=3, u=1, v=5)
    flows = [(0, 1, 6), (1, 0, 1), (1, 2, 2), (2, 1, 6), (2, 0, 5), (0, 2, Fraction(1, 2)),
             (0, 2, 5), (2, 3, 25), (3, 2, 3)]
    expected = steady(4, [(a, b, Fraction(rate)) for a, b, rate in flows])
    assert p == dict(zip("ABCD", expected, strict=True))
    assert module.FUNCTIONS == {}


def test_modules_run_alone_and_their_doctests_pass(tmp_path: Path) -> None:
    networks = [read_network(path) for path in CASES] + [mill(), awkward(), hinge(), complete(6)]
    extra: dict[str, list[str]] = {
        "mill": MILL_QUANTITIES,
        "complete 6": ["d (d p[s1] / d barrier[t0_1]) / d energy[s0]", "entropy_production",
                       "d (d p[s2] / d ln c) / d drive[t0_1]"],
        "hinge": ["mean[depth]", "d mean[depth] / d E_A", "d p[A] / d F", "entropy_production"]}
    paths = [str(export_functions(network, tmp_path / f"m{place}.py", extra.get(network.title)))
             for place, network in enumerate(networks)]
    code = ("import doctest, importlib.util, sys\n"
            "for path in sys.argv[1:]:\n"
            "    spec = importlib.util.spec_from_file_location('m', path)\n"
            "    module = importlib.util.module_from_spec(spec)\n"
            "    spec.loader.exec_module(module)\n"
            "    print(*doctest.testmod(module))\n"
            "assert not {'numpy', 'symbolic_response'} & set(sys.modules)\n")
    done = subprocess.run([sys.executable, "-I", "-S", "-c", code, *paths], capture_output=True,
                          text=True, check=False, timeout=60)
    assert done.returncode == 0, done.stdout + done.stderr
    results = [tuple(map(int, line.split())) for line in done.stdout.splitlines()]
    assert [failed for failed, _ in results] == [0] * len(networks), done.stdout
    assert all(tried > 5 for _, tried in results)
    assert all("Not tested" not in Path(path).read_text(encoding="utf-8") for path in paths)


def test_arrays_broadcast_and_agree_with_scalars() -> None:
    network, rng = hinge(), np.random.default_rng(3)
    asked = ["p[A]", "current[one]", "entropy_production", "d p[B] / d drive[one]", "mean[depth]"]
    module = module_of(functions_text(network, asked))
    at = {entry.name: rng.normal(size=1000) for entry in network.symbols}
    at["B2"] = 0.25
    for quantity in asked:
        found = called(module, quantity, at)
        assert found.shape == (1000,) and found.dtype == float
        for place in range(0, 1000, 83):
            scalar = {k: v if k == "B2" else float(v[place]) for k, v in at.items()}
            assert math.isclose(found[place], called(module, quantity, scalar), rel_tol=1e-11,
                                abs_tol=1e-13)
    rows = {**at, "F": np.linspace(-1, 1, 4)[:, None], "B2": Fraction(1, 4)}
    assert called(module, "p[A]", rows).shape == (4, 1000)


def test_arrays_beside_fractions_and_integers() -> None:
    module = module_of(functions_text(mill(), MILL_QUANTITIES))
    whole = np.array([1, 2, 30_000])
    at = {"c": whole, "k": Fraction(1, 3), "u": 2, "v": 0.5}
    for quantity in MILL_QUANTITIES[:-1]:
        found = called(module, quantity, at)
        assert found.dtype == float
        for x, value in zip(whole, found, strict=True):
            exact = mill_values({"c": Fraction(int(x)), "k": Fraction(1, 3), "u": Fraction(2),
                                 "v": Fraction(1, 2)})[quantity]
            assert math.isclose(value, exact, rel_tol=1e-9, abs_tol=1e-12), quantity
    exact_array = np.array([Fraction(2), Fraction(5, 3)], dtype=object)
    found = called(module, "p[A, C]", {"c": exact_array, "k": 3, "u": 1, "v": 5})
    assert found[0] == called(module, "p[A, C]", {"c": 2, "k": 3, "u": 1, "v": 5})
    large = np.array([4_000_000_000, 3])  # the square does not fit in 64 bits
    found = called(module, "p[A, C]", dict.fromkeys("ckuv", large))
    exact = mill_values(dict.fromkeys("ckuv", Fraction(4_000_000_000)))["p[A, C]"]
    assert math.isclose(found[0], exact, rel_tol=1e-12)
    with pytest.raises(TypeError, match="NumPy"):
        called(module, "p[A, C]", {"c": [1, 2], "k": 3, "u": 1, "v": 5})


def test_energy_form_against_floats() -> None:
    network = hinge()
    asked = ["p[A]", "mean[depth]", "entropy_production", "d p[A] / d F", "d mean[depth] / d E_A",
             "d current[two] / d barrier[one]"]
    module, rng = module_of(functions_text(network, asked)), random.Random(5)
    for _ in range(5):
        at = {entry.name: rng.uniform(-2, 2) for entry in network.symbols}
        exact = hinge_floats(at)
        for quantity in asked[:3]:
            assert math.isclose(called(module, quantity, at), exact[quantity], rel_tol=1e-9)
        h = 1e-5  # central differences: error h**2 times a third derivative of order 1, 1e-9
        for quantity, inner, name in ((asked[3], "p[A]", "F"), (asked[4], "mean[depth]", "E_A")):
            up, down = (hinge_floats({**at, name: at[name] + step})[inner] for step in (h, -h))
            assert abs(called(module, quantity, at) - (up - down) / (2 * h)) < 1e-7
        up, down = (hinge_floats(at, step)["current[two]"] for step in (h, -h))
        assert abs(called(module, asked[5], at) - (up - down) / (2 * h)) < 1e-6


def hinge_floats(at: Mapping[str, float], raised: float = 0.0) -> dict[str, float]:
    """Return quantities of the hinge from exp(E - B +- F/2) and a linear solver."""
    energies = [at["E_A"], at["E_B"], 0.0]
    edges = [(0, 1, at["B1"] + raised, at["F"]), (1, 2, at["B2"], 0.0), (2, 0, 0.0, at["F"] / 3),
             (0, 1, at["B1"] / 2, 0.0)]
    matrix, rates = np.zeros((3, 3)), []
    for a, b, barrier, drive in edges:
        pair = (math.exp(energies[a] - barrier + drive / 2),
                math.exp(energies[b] - barrier - drive / 2))
        rates.append(pair)
        for tail, head, rate in ((a, b, pair[0]), (b, a, pair[1])):
            matrix[head, tail] += rate
            matrix[tail, tail] -= rate
    matrix[-1] = 1
    p = np.linalg.solve(matrix, [0, 0, 1])
    flows = [w * p[a] - v * p[b] for (a, b, _, _), (w, v) in zip(edges, rates, strict=True)]
    return {"p[A]": p[0], "mean[depth]": float(energies @ p), "current[two]": flows[1],
            "entropy_production": sum(j * math.log(w * p[a] / (v * p[b])) for (a, b, _, _), (w, v),
                                      j in zip(edges, rates, flows, strict=True))}


def test_awkward_names_are_safe() -> None:
    network = awkward()
    names = [entry.name for entry in network.symbols]
    module = module_of(functions_text(network, ["p[I]", "mean[print]", "d p[np] / d ln lambda"]))
    assert module.SYMBOLS["lambda_"] == "lambda_" and module.SYMBOLS["lambda"] == "lambda__"
    assert module.SYMBOLS["None"] == "None_" and module.SYMBOLS["np"] == "np"
    at = drawn(names, random.Random(2))
    at["math"], at["Fraction"] = Fraction(0), Fraction(9, 4)
    ahead = at["lambda"] * at["None"]
    flows = [(0, 1, ahead), (1, 0, at["I"]), (1, 2, at["np"] + at["numpy"]),
             (2, 1, Fraction(3, 2)), (2, 0, at["in"] * at["D"] / at["x1"]),
             (0, 2, at["N_I"] * at["e"])]
    p = steady(3, flows)
    slope = changed(3, flows, [ahead, *[Fraction(0)] * 5], p)[1]
    mean = p[0] * at["lambda_"] + p[1] * at["float"]
    expected = {"p[I]": p[0], "mean[print]": mean, "d p[np] / d ln lambda": slope}
    for quantity, value in expected.items():
        assert math.isclose(called(module, quantity, at), value, rel_tol=1e-12), quantity
    assert ">>> raise" not in (module.__doc__ or "")


def test_names_of_functions_and_arguments() -> None:
    assert list(function_names(["p[A]", "p[A", "in", "2*p[A]"]).values()) == [
        "p_A", "p_A_2", "in_2", "quantity_2_times_p_A"]
    assert argument_names(["in", "in_", "in__"]) == {"in": "in___", "in_": "in_", "in__": "in__"}


def test_the_same_text_every_time() -> None:
    code = ("import sys; sys.path.insert(0, 'tests')\n"
            "from test_export import mill, MILL_QUANTITIES, functions_text\n"
            "import hashlib\n"
            "print(hashlib.sha256(functions_text(mill(), MILL_QUANTITIES).encode()).hexdigest())")
    made = {subprocess.run([sys.executable, "-c", code], capture_output=True, text=True,
                           check=True, cwd=Path(__file__).parent.parent,
                           env={"PYTHONHASHSEED": seed, "PATH": ""}).stdout for seed in "12"}
    assert len(made) == 1


def test_large_networks_go_by_elimination() -> None:
    network = complete(9)  # 9**8 rooted trees
    text = functions_text(network, ["p[s4]", "d p[s2] / d ln c"])
    module, names = module_of(text), [entry.name for entry in network.symbols]
    at = drawn(names, random.Random(1))
    flows, moves = [], []
    for a in range(9):
        for b in range(9):
            if a != b:
                rate = at[f"k{a}_{b}"] * (at["c"] if a == 0 else 1)
                flows.append((a, b, rate))
                moves.append(rate if a == 0 else Fraction(0))
    p = steady(9, flows)
    assert called(module, "p[s4]", at) == p[4]
    assert called(module, "d p[s2] / d ln c", at) == changed(9, flows, moves, p)[2]
    assert len(text) < 60_000


def test_tree_sums_are_named_once() -> None:
    text = functions_text(mill(), [])
    body = text[text.index("def steady_state"):]
    assert all(body.count(f"N_{state} = ") == 1 for state in "ABCD")
    assert body.count("    D = N_A + N_B + N_C + N_D\n") == 1


def test_too_large_is_one_line(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(program, "MAX_NODES", 50)
    with pytest.raises(SizeLimitError, match=r"^[^\n]*50 steps[^\n]*$"):
        functions_text(complete(9), ["p[s4]"])


# -- JSON ----------------------------------------------------------------------------------------


@pytest.mark.parametrize("network", [*map(read_network, CASES), mill(), hinge()],
                         ids=lambda network: network.title[:12])
def test_expressions_read_back_as_they_were_derived(network: Network) -> None:
    data = json.loads(json_text(network))
    assert data["format"] == "symbolic-response-results" and data["version"] == 1
    analysis = Analysis(network)
    assert [entry["quantity"] for entry in data["steady_state"]] == [
        f"p[{state.name}]" for state in network.states]
    for entry in (*data["steady_state"], *data["quantities"]):
        read_quantity(entry["quantity"], network)
        derived = derive(analysis, entry["quantity"])
        assert (entry["expression"], entry["latex"]) == (derived.expression, derived.latex)
        expression_text(read_expression(entry["expression"]))
        at = derive(analysis, entry["quantity"], at=entry["point"])
        assert at.value is not None
        if entry["enclosure"] is None:
            assert at.value.exact == Fraction(entry["value"])
        else:
            low, high = map(Fraction, entry["enclosure"])
            read = derive(analysis, entry["value"])
            assert read.value is not None and read.value.enclosure is not None
            assert low <= Fraction(read.value.enclosure[1])
            assert Fraction(read.value.enclosure[0]) <= high


def test_values_in_json_are_those_of_the_oracle() -> None:
    data = json.loads(json_text(mill(), MILL_QUANTITIES))
    assert [entry["quantity"] for entry in data["quantities"]] == MILL_QUANTITIES
    for entry in data["quantities"]:
        at = {name: Fraction(value) for name, value in entry["point"].items()}
        assert Fraction(entry["value"]) == mill_values(at)[entry["quantity"]]
        given = {**at, "ln": math.log, "exp": math.exp}
        shown = eval(entry["expression"], {}, given)  # floats where a rate holds numbers alone
        assert math.isclose(shown, Fraction(entry["value"]), rel_tol=1e-12)


def test_the_network_in_json() -> None:
    data = json.loads(json_text(mill(), ["p[A]"]))
    assert data["network"]["transitions"][3] == {
        "name": "leak", "between": ["A", "C"], "forward": "u*v", "backward": None,
        "barrier": None, "drive": None}
    assert data["network"]["observables"][0]["values"] == {"A": "1/3", "B": "c", "C": "0",
                                                           "D": "-2"}
    assert data["network"]["symbols"][0].keys() == {"name", "about", "sign", "range", "latex"}
    # spanning trees by hand: 3 of the ring, 2 more with leak in drop's place, all with store
    assert data["trees"]["undirected"] == 5
    assert {frozenset(cycle["transitions"]) for cycle in data["cycles"]} == {
        frozenset(text.split()) for text in ("wet grind drop", "wet grind leak", "drop leak")}
    assert [cycle["force"] for cycle in data["cycles"]
            if "leak" in cycle["transitions"]] and data["detailed_balance"] is False
    forces = {frozenset(c["transitions"]): c["force"] for c in data["cycles"]}
    assert forces[frozenset(["drop", "leak"])] in ("infinite", "-infinite")
    assert read_expression(forces[frozenset(["wet", "grind", "drop"])])
    assert data["beyond_limits"] == []


def test_what_is_beyond_a_limit_is_named() -> None:
    analysis = Analysis(complete(6), tree_limit=100)
    data = json.loads(json_text(analysis, ["p[s1]"]))
    assert data["quantities"][0]["expression"] is None and data["quantities"][0]["value"]
    assert any(text.startswith("p[s1]: ") for text in data["beyond_limits"])


# -- files and errors ----------------------------------------------------------------------------


def test_files_are_written_all_or_none(tmp_path: Path) -> None:
    network = read_network(CASES[0])
    export_files(network, [tmp_path / "a.py", tmp_path / "a.json"], ["1/2"])
    assert sorted(path.name for path in tmp_path.iterdir()) == ["a.json", "a.py"]
    with pytest.raises(OutputError, match="there is no folder"):
        export_files(network, [tmp_path / "b.py", tmp_path / "no" / "b.json"])
    assert not (tmp_path / "b.py").exists()


def test_faults_are_one_line(tmp_path: Path) -> None:
    source = tmp_path / "network.json"
    source.write_text(CASES[0].read_text(encoding="utf-8"), encoding="utf-8")
    network = read_network(source)
    faults: list[tuple[type[Exception], str, Callable[[], object]]] = [
        (OutputError, r"write \.py or \.json", lambda: export_files(network, [tmp_path / "a.tex"])),
        (OutputError, r"ends in \.py", lambda: export_functions(network, tmp_path / "a.json")),
        (OutputError, "network file itself", lambda: export_json(network, source)),
        (OutputError, "is a folder", lambda: export_functions(network, _folder(tmp_path))),
        (QuantityError, "entry 1: .*nowhere", lambda: functions_text(network, ["p[nowhere]"])),
        (EvaluationError, "negative", lambda: functions_text(mill(), ["ln(-c)"])),
        (EvaluationError, "division by", lambda: functions_text(mill(), ["1/(c - c)"])),
        (NetworkError, "in quotes", lambda: functions_text(mill(), [3])),  # type: ignore[list-item]
    ]
    for kind, message, wrong in faults:
        with pytest.raises(kind, match=message) as caught:
            wrong()
        assert "\n" not in str(caught.value)


def _folder(place: Path) -> Path:
    (place / "folder.py").mkdir()
    return place / "folder.py"


def test_the_verb(tmp_path: Path) -> None:
    from click.testing import CliRunner

    from symbolic_response.cli.exporting import export

    files = [str(tmp_path / "t.py"), str(tmp_path / "t.json")]
    done = CliRunner().invoke(export, [str(CASES[0]), "-o", files[0], "-o", files[1], "--json",
                                       "--quiet"])
    assert done.exit_code == 0, done.output
    assert json.loads(done.output)["files"] == files
    asked = json.loads(Path(files[1]).read_text(encoding="utf-8"))["quantities"]
    module = module_of(Path(files[0]).read_text(encoding="utf-8"))
    assert [entry["quantity"] for entry in asked] == list(module.FUNCTIONS)
    again = CliRunner().invoke(export, [str(CASES[0]), "-o", str(tmp_path / "t.txt")])
    assert isinstance(again.exception, OutputError)
