"""What ``derive`` answers: JSON and values by the rules, right numbers on networks of odd kinds.

The numbers come from mpmath at 110 digits: the linear system W p = 0, and central differences
for responses. Nothing of the package takes part in them but the text it printed.
"""

from __future__ import annotations

import json
import random
import re
from collections.abc import Mapping
from fractions import Fraction
from pathlib import Path
from typing import Any

import mpmath
import pytest
from mpmath import mp, mpf

from symbolic_response.cli import run

STEP = mpf(10) ** -22
FUNCTIONS = {"exp": mpmath.exp, "ln": mpmath.log, "sqrt": mpmath.sqrt}
Values = Mapping[str, Any]


@pytest.fixture(autouse=True)
def digits() -> Any:
    with mp.workdps(110):
        yield


def evaluate(text: str, values: Values) -> Any:
    """Return the value of an expression in the syntax of the file; only for texts made here."""
    exact = re.sub(r"(?<![A-Za-z0-9_])(\d+(?:\.\d*)?(?:e[+-]?\d+)?)", r"N('\1')", text)
    named = re.sub(r"\b(?!N\()([A-Za-z][A-Za-z0-9_]*)(?!\w*')",
                   lambda m: m[1] if m[1] in FUNCTIONS else f"V[{m[1]!r}]", exact)
    return mpf(eval(named, {"__builtins__": {}}, {"N": mpf, "V": values, **FUNCTIONS}))


class Model:
    """A network as text and as numbers: transitions as (name, first, second, forward, backward)."""

    def __init__(self, states: str, transitions: list[tuple[str, str, str, str, str | None]],
                 symbols: dict[str, str], observables: dict[str, dict[str, str]] | None = None,
                 energies: dict[str, str] | None = None) -> None:
        self.states, self.transitions, self.symbols = states.split(), transitions, symbols
        self.observables, self.energies = observables or {}, energies or {}

    def text(self) -> str:
        lines = ['title = "model"']
        for name, sign in self.symbols.items():
            lines += [f"[symbols.{name}]", f'sign = "{sign}"']
        for state in self.states:
            lines.append(f"[states.{state}]")
            if state in self.energies:
                lines.append(f'energy = "{self.energies[state]}"')
        for name, first, second, ahead, back in self.transitions:
            lines += ["[[transitions]]", f'name = "{name}"', f'between = ["{first}", "{second}"]']
            if ahead.startswith("B="):
                lines.append(f'barrier = "{ahead[2:]}"')
                lines += [f'drive = "{back}"'] if back else []
            else:
                lines.append(f"rates = {[ahead] if back is None else [ahead, back]}")
        for name, entries in self.observables.items():
            lines += [f"[observables.{name}]", *(f'{k} = "{v}"' for k, v in entries.items())]
        return "\n".join(lines) + "\n"

    def rates(self, values: Values, raised: Values) -> list[tuple[Any, Any]]:
        found = []
        for name, first, second, ahead, back in self.transitions:
            if ahead.startswith("B="):
                barrier = evaluate(ahead[2:], values)
                drive = evaluate(back, values) if back else mpf(0)
                pair = [mpmath.exp(evaluate(self.energies[state], values) - barrier + sign * drive)
                        for state, sign in ((first, mpf(1) / 2), (second, -mpf(1) / 2))]
            else:
                pair = [evaluate(ahead, values), evaluate(back, values) if back else mpf(0)]
            lift = -raised.get(f"barrier[{name}]", 0)
            half = raised.get(f"drive[{name}]", 0) / mpf(2)
            found.append((
                pair[0] * mpmath.exp(lift + half + raised.get(f"energy[{first}]", 0)),
                pair[1] * mpmath.exp(lift - half + raised.get(f"energy[{second}]", 0))))
        return found

    def steady(self, rates: list[tuple[Any, Any]]) -> dict[str, Any]:
        size = len(self.states)
        matrix = mpmath.zeros(size)
        for (_, first, second, *_), (ahead, back) in zip(self.transitions, rates, strict=True):
            i, j = self.states.index(first), self.states.index(second)
            matrix[j, i] += ahead
            matrix[i, i] -= ahead
            matrix[i, j] += back
            matrix[j, j] -= back
        for column in range(size):
            matrix[size - 1, column] = 1
        right = mpmath.zeros(size, 1)
        right[size - 1] = 1
        return dict(zip(self.states, mpmath.lu_solve(matrix, right), strict=True))

    def quantity(self, text: str, values: Values, raised: Values) -> Any:
        """Return the value of a quantity that is one atom, or an expression of atoms."""
        rates = self.rates(values, raised)
        p = self.steady(rates)
        flows = {name: (ahead * p[first], back * p[second], ahead, back) for
                 (name, first, second, *_), (ahead, back) in zip(self.transitions, rates,
                                                                 strict=True)}
        atoms: dict[str, Any] = {}

        def atom(found: re.Match[str]) -> str:
            kind, names = found[1], [name.strip() for name in (found[2] or "").split(",")]
            value = {
                "p": lambda: sum(p[name] for name in names),
                "mean": lambda: sum(evaluate(v, values) * p[k]
                                    for k, v in self.observables[names[0]].items()),
                "current": lambda: flows[names[0]][0] - flows[names[0]][1],
                "traffic": lambda: flows[names[0]][0] + flows[names[0]][1],
                "forward": lambda: flows[names[0]][2],
                "backward": lambda: flows[names[0]][3],
                "entropy_production": lambda: sum((a - b) * mpmath.log(a / b)
                                                  for a, b, *_ in flows.values()),
            }[kind]()
            atoms[f"atom{len(atoms)}"] = value
            return f"atom{len(atoms) - 1}"

        pattern = r"\b(p|mean|current|traffic|forward|backward)\[([^]]*)\]|\b(?=entropy)(\w+)"
        plain = re.sub(pattern.replace("|\\b(?=entropy)(\\w+)", ""), atom, text)
        plain = re.sub(r"\b(entropy_production)()\b", atom, plain)
        return evaluate(plain, {**values, **atoms})

    def value(
        self, text: str, steps: list[str], values: Values, raised: Values | None = None
    ) -> Any:
        """Return the derivative of a quantity by each perturbation of ``steps`` in turn."""
        raised = raised or {}
        if not steps:
            return self.quantity(text, values, raised)
        *inner, step = steps
        ends = []
        for sign in (1, -1):
            moved, changed = dict(values), dict(raised)
            if step.startswith("ln "):
                moved[step[3:]] *= mpmath.exp(sign * STEP)
            elif "[" in step:
                changed[step] = changed.get(step, mpf(0)) + sign * STEP
            else:
                moved[step] += sign * STEP
            ends.append(self.value(text, inner, moved, changed))
        return (ends[0] - ends[1]) / (2 * STEP)


SIGNS = {"k": "positive", "c": "positive", "u": "positive", "x": "real"}
MODELS = {
    "parallel channels": Model(
        "A B", [("one", "A", "B", "k*c", "u"), ("two", "B", "A", "k + u*c", "x**2 + 1"),
                ("three", "A", "B", "1/3", "0.25")], SIGNS, {"q": {"A": "c", "B": "x*c**2"}}),
    "one-way steps": Model(
        "A B C", [("one", "A", "B", "k*c", None), ("two", "B", "C", "u", "exp(x)"),
                  ("three", "C", "A", "k*exp(-x)", None)], SIGNS, {"q": {"B": "x", "C": "1/2"}}),
    "sums, roots, logarithms": Model(
        "A B C", [("one", "A", "B", "k + u*c", "sqrt(k*c)"),
                  ("two", "B", "C", "ln(2 + k*c)", "(k + u)**(1/3)"),
                  ("three", "A", "C", "c**(3/2)*exp(-c)", "k*exp(x)/(1 + exp(x))")], SIGNS,
        {"q": {"A": "sqrt(k)", "B": "ln(c)", "C": "exp(x)"}}),
    "the same root twice": Model(
        "A B C D", [("one", "A", "B", "exp(-x)", "(k+u)**(1/3)"),
                    ("two", "B", "C", "exp(k/c)", "(k+u)**(1/3)"),
                    ("three", "C", "D", "ln(2+k*c)", "1/7"), ("four", "D", "A", "c", "c*(1+k/u)"),
                    ("five", "D", "A", "c", "exp(ln(k)/3 + x)")], SIGNS, {"q": {"A": "1"}}),
    "energies": Model(
        "A B C", [("one", "A", "B", "B=k", "x"), ("two", "B", "C", "B=x/2 + ln(u)", None),
                  ("three", "C", "A", "B=0", "2*ln(c/u)"), ("four", "C", "A", "k*exp(x)", "c")],
        SIGNS, {"q": {"A": "x", "B": "x**2"}}, {"A": "x", "B": "ln(k) - x", "C": "1/3"}),
    "numbers": Model(
        "A B C", [("one", "A", "B", "3", "1/7"), ("two", "B", "C", "0.1", "2"),
                  ("three", "C", "A", "1e-3", "k*c*u*exp(x)")], SIGNS, {"q": {"C": "k"}}),
}
POINTS = [
    {"k": "3/2", "c": "4", "u": "1/5", "x": "ln(9/4)"},
    {"k": "2", "c": "exp(1/2)", "u": "7/3", "x": "-1/3"},
    {"k": "sqrt(2)", "c": "1/9", "u": "ln(3)", "x": "0"},
]
ASKED: list[tuple[str, list[str]]] = [
    ("p[A]", []), ("p[A, B]", ["ln c"]), ("p[A]/p[B]", ["barrier[one]"]), ("ln(p[A])", ["c"]),
    ("mean[q]", ["c"]), ("mean[q]", ["x"]), ("mean[q]", ["energy[A]"]), ("mean[q]", ["k", "c"]),
    ("current[one]", []), ("current[one]", ["drive[two]"]), ("traffic[two]", ["c"]),
    ("forward[one]*p[A]", ["k"]), ("backward[two]", ["energy[B]"]), ("c*current[one]", ["c"]),
    ("p[A]", ["energy[A]", "energy[A]"]), ("p[B]", ["drive[one]", "ln c"]),
    ("sqrt(p[B])", ["x"]), ("current[two]/traffic[two]", ["barrier[one]", "x"]),
]
ENTROPY: list[tuple[str, list[str]]] = [
    ("entropy_production", []), ("entropy_production", ["c"]),
    ("entropy_production", ["barrier[one]"]), ("entropy_production", ["energy[A]"]),
]


def response_text(text: str, steps: list[str]) -> str:
    for step in steps:
        text = f"(d {text} / d {step})"
    return text[1:-1] if steps else text


def derived(capfd: pytest.CaptureFixture[str], path: Path, *arguments: str) -> list[dict[str, Any]]:
    assert run(["derive", str(path), "--json", "--quiet", *arguments]) == 0
    results: list[dict[str, Any]] = json.loads(capfd.readouterr().out)["results"]
    return results


def close(a: Any, b: Any) -> bool:
    return bool(abs(a - b) <= mpf(10) ** -15 * (1 + abs(b)))


def check_value(result: dict[str, Any], expected: Any) -> None:
    """Check a result without symbols: an exact fraction, or an expression in its enclosure."""
    found = evaluate(result["value"], {})
    assert close(found, expected)
    if "enclosure" in result:
        low, high = (mpf(end) for end in result["enclosure"])
        assert low <= found <= high
        assert high - low <= min(abs(low), abs(high)) * mpf(10) ** -20
        assert result["expression"] == result["value"]
    else:
        assert str(Fraction(result["value"])) == result["value"]


@pytest.mark.parametrize("name", MODELS)
def test_right_numbers(name: str, tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    model, path = MODELS[name], tmp_path / "net.toml"
    path.write_text(model.text(), encoding="utf-8")
    asked = ASKED + (ENTROPY if name != "one-way steps" else [])
    for place, point in enumerate(POINTS):  # a third of the quantities at each point
        some = asked[place :: len(POINTS)]
        texts = [response_text(*item) for item in some]
        values = {symbol: evaluate(text, {}) for symbol, text in point.items()}
        at = [word for symbol, text in point.items() for word in ("--at", f"{symbol}={text}")]
        answers = (derived(capfd, path, *texts, *more) for more in ([], at, at[:4]))
        for item, form, full, part in zip(some, *answers, strict=True):
            expected = model.value(*item, values)
            assert close(evaluate(form["expression"], values), expected), item
            assert close(evaluate(part["expression"], values), expected), item
            assert not re.search(r"\b[kc]\b", part["expression"])
            check_value(full, expected)


def test_the_same_root_twice_at_a_partial_point(
    tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    model, path = MODELS["the same root twice"], tmp_path / "net.toml"
    path.write_text(model.text(), encoding="utf-8")
    values = {"k": mpf(5) / 2, "c": mpf(3) / 2, "u": mpf(7) / 2, "x": mpf(1) / 3}
    part, = derived(capfd, path, "d traffic[five] / d c", "--at", "c=3/2", "--at", "k=5/2")
    assert close(evaluate(part["expression"], values), model.value("traffic[five]", ["c"], values))


def test_entropy_production_responds_to_a_drive(
    tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    model, path = MODELS["parallel channels"], tmp_path / "net.toml"
    path.write_text(model.text(), encoding="utf-8")
    values = {symbol: evaluate(text, {}) for symbol, text in POINTS[0].items()}
    form, = derived(capfd, path, "d entropy_production / d drive[one]")
    expected = model.value("entropy_production", ["drive[one]"], values)
    assert close(evaluate(form["expression"], values), expected)


def test_entropy_production_responds_to_a_drive_at_a_point(
    tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    model, path = MODELS["parallel channels"], tmp_path / "net.toml"
    path.write_text(model.text(), encoding="utf-8")
    values = {symbol: evaluate(text, {}) for symbol, text in POINTS[0].items()}
    point = {**POINTS[0], "x": "1/3"}
    values["x"] = mpf(1) / 3
    at = [word for symbol, text in point.items() for word in ("--at", f"{symbol}={text}")]
    for steps in (["drive[one]"], ["drive[two]", "drive[one]"], ["c", "drive[three]"]):
        result, = derived(capfd, path, response_text("entropy_production", steps), *at)
        check_value(result, model.value("entropy_production", steps, values))


# -- semantics ------------------------------------------------------------------------------------

PAIR = Model("A B", [("t", "A", "B", "k*c", "u*exp(x)")], SIGNS, {"q": {"A": "c"}})


@pytest.fixture
def pair(tmp_path: Path) -> Path:
    path = tmp_path / "pair.toml"
    path.write_text(PAIR.text(), encoding="utf-8")
    return path


@pytest.mark.parametrize(("quantity", "at", "value"), [
    ("p[B]", [], None),
    ("p[B]", ["c=2"], None),
    ("p[B]", ["c=2", "k=3", "u=4"], None),
    ("p[B]", ["c=2", "k=3", "u=4", "x=0"], "3/5"),
    ("p[B]", ["c=2", "k=3", "u=4", "x=ln(3/2)"], "1/2"),
    ("p[B]", ["c=2", "k=3", "u=1/2", "x=2*ln(2) + ln(3)"], "1/2"),
    ("p[B]", ["c=0.5", "k=3", "u=1.5", "x=0"], "1/2"),
    ("p[B]", ["c=sqrt(2)", "k=sqrt(8)", "u=4", "x=0"], "1/2"),
    ("p[B]", ["c=exp(2)", "k=exp(-2)", "u=1", "x=0"], "1/2"),
    ("p[A] + p[B]", [], "1"),
    ("p[A] - p[A]", [], "0"),
    ("current[t]", [], "0"),
    ("entropy_production", [], "0"),
    ("c", ["c=7/3"], "7/3"),
    ("c + k", ["c=7/3"], None),
    ("2/4", [], "1/2"),
    ("d c / d c", [], "1"),
    ("d p[A] / d barrier[t]", [], "0"),
    ("ln(p[A]/p[B])", ["k=1", "c=2", "u=2", "x=0"], "0"),
    ("sqrt(c - 3)", ["k=1", "c=3", "u=2", "x=0"], "0"),
    ("sqrt(c - 3)", ["c=3"], "0"),
    ("x", ["x=-5"], "-5"),
    ("d ln(p[A]/p[B]) / d energy[A]", [], "-1"),
    ("(p[A] - p[A])**0", [], "1"),
])
def test_value(quantity: str, at: list[str], value: str | None, pair: Path,
               capfd: pytest.CaptureFixture[str]) -> None:
    result, = derived(capfd, pair, quantity, *(w for text in at for w in ("--at", text)))
    assert result["value"] == value
    assert "enclosure" not in result
    if value is not None:
        assert result["expression"] == value


@pytest.mark.parametrize("at", [
    ["k=1", "c=2", "u=3", "x=1"], ["k=1", "c=sqrt(2)", "u=3", "x=0"],
    ["k=ln(2)", "c=1", "u=1", "x=0"], ["k=1", "c=exp(300)", "u=1", "x=0"],
    ["k=1", "c=1e-90", "u=sqrt(7)", "x=-400"], ["k=1", "c=1", "u=1", "x=exp(-60)"],
])
@pytest.mark.parametrize("quantity", ["p[A]", "p[B] - 1/2", "ln(p[A])", "d p[A] / d ln c"])
def test_enclosures(quantity: str, at: list[str], pair: Path,
                    capfd: pytest.CaptureFixture[str]) -> None:
    result, = derived(capfd, pair, quantity, *(w for text in at for w in ("--at", text)))
    with mp.workdps(400):
        values = {text.partition("=")[0]: evaluate(text.partition("=")[2], {}) for text in at}
        a, b = values["u"] * mpmath.exp(values["x"]), values["k"] * values["c"]
        expected = {"p[A]": a / (a + b), "p[B] - 1/2": (b - a) / (a + b) / 2,
                    "ln(p[A])": mpmath.log(a / (a + b)), "d p[A] / d ln c": -a * b / (a + b)**2}
        low, high = (mpf(end) for end in result["enclosure"])
        assert low <= expected[quantity] <= high
        assert high - low <= min(abs(low), abs(high)) * mpf(10) ** -20
        assert abs(evaluate(result["value"], {}) / expected[quantity] - 1) < mpf(10) ** -60


COARSE = Model("A B C", [("one", "A", "B", "exp(x)", "k"), ("two", "B", "C", "exp(x) + 1", "c"),
                         ("three", "C", "A", "exp(x)", "u")], SIGNS)


@pytest.mark.parametrize("x", ["3.14159", "-1.23456789", "1000.001", "1e9", "-1e18", "1e30",
                               "1e-300", "ln(1001)/3", "3000*ln(3/2)"])
def test_values_that_make_long_exponents(
    x: str, tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "net.toml"
    path.write_text(COARSE.text(), encoding="utf-8")
    at = ["--at", f"x={x}", "--at", "k=2", "--at", "c=1/3"]
    part, = derived(capfd, path, "p[A]", *at)
    full, = derived(capfd, path, "p[A]", *at, "--at", "u=5")
    values = {"x": evaluate(x, {}), "k": mpf(2), "c": mpf(1) / 3, "u": mpf(5)}
    assert part["value"] is None
    if abs(values["x"]) < 100:  # beyond, mpmath needs more than 110 digits for the system
        expected = COARSE.value("p[A]", [], values)
        assert close(evaluate(part["expression"], values), expected)
        assert close(evaluate(full["value"], {}), expected)
    low, high = (Fraction(end) for end in full.get("enclosure", [full["value"]] * 2))
    assert 0 < low <= high < 1
    assert "ln(1001)" not in part["expression"]


def test_a_value_with_a_long_exponent_of_its_own(
    pair: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    result, = derived(capfd, pair, "p[B]", "--at", "k=1 + exp(-10**5)", "--at", "c=1", "--at",
                      "u=1", "--at", "x=0")
    low, high = (Fraction(end) for end in result["enclosure"])
    assert low <= Fraction(1, 2) <= high


def test_set_then_at(pair: Path, capfd: pytest.CaptureFixture[str]) -> None:
    first, = derived(capfd, pair, "p[B]", "--set", "u=k*c**2", "--set", "x=ln(2)")
    assert first["value"] is None
    assert evaluate(first["expression"], {"c": mpf(3)}) == mpf(1) / 7
    second, = derived(capfd, pair, "p[B]", "--set", "u=k*c**2", "--set", "x=ln(2)", "--at", "c=3")
    assert second["value"] == "1/7"
    swapped, = derived(capfd, pair, "k/c", "--set", "k=c", "--set", "c=k", "--at", "k=2",
                       "--at", "c=3")
    assert swapped["value"] == "3/2"
    # the derivative is taken after the substitution: by the c that is left
    after, = derived(capfd, pair, "d p[B] / d c", "--set", "u=k*c**2", "--set", "x=0")
    assert close(evaluate(after["expression"], {"c": mpf(2)}), -mpf(1) / 9)


def test_words_of_python_and_of_sympy_are_ordinary_names(
    tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    names = ["lambda", "None", "I", "pi", "E", "S", "N", "O", "Q", "zoo", "oo", "nan", "True",
             "import", "class", "x1", "e", "V", "Symbol"]
    path = tmp_path / "names.toml"
    lines = ['title = "names"', *(f"[symbols.{name}]" for name in names),
             *(f"[states.{name}]" for name in names)]
    for place, name in enumerate(names):
        after, second = names[(place + 1) % len(names)], names[place - 1]
        lines += ["[[transitions]]", f'between = ["{name}", "{after}"]',
                  f'rates = ["{name}", "{second}"]']
    lines += ["[observables.pi]", 'E = "I*pi"']
    path.write_text("\n".join(lines), encoding="utf-8")
    asked = ["p[lambda]", "d p[pi] / d ln I", "mean[pi]", "d p[S] / d None", "E*N/I"]
    at = [word for place, name in enumerate(names) for word in ("--at", f"{name}={place + 1}")]
    exact = derived(capfd, path, *asked, *at)
    assert exact[-1]["value"] == "35/3"
    assert all(result["value"] is not None for result in exact)
    assert run(["survey", str(path), "--json"]) == 0
    assert json.loads(capfd.readouterr().out)["states"] == names
    short = Model("lambda None", [("import", "lambda", "None", "I*pi", "E + S"),
                                  ("class", "lambda", "None", "N", "zoo*True")],
                  dict.fromkeys(["I", "pi", "E", "S", "N", "zoo", "True"], "positive"))
    path.write_text(short.text(), encoding="utf-8")
    values = {name: mpf(place + 2) for place, name in enumerate(short.symbols)}
    for text, steps in (("p[lambda]", ["I"]), ("current[import]", []), ("E/True", ["ln True"])):
        form, = derived(capfd, path, response_text(text, steps))
        assert close(evaluate(form["expression"], values), short.value(text, steps, values))


def test_many_random_points(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    path, model = tmp_path / "net.toml", MODELS["sums, roots, logarithms"]
    path.write_text(model.text(), encoding="utf-8")
    steps = ["c", "u"]
    form, = derived(capfd, path, response_text("p[A]*current[two]", steps))
    source = random.Random(5)
    for _ in range(5):
        values = {name: mpf(source.randint(1, 40)) / source.randint(1, 40) for name in SIGNS}
        expected = model.value("p[A]*current[two]", steps, values)
        assert close(evaluate(form["expression"], values), expected)
