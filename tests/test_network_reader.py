"""The network file: what a valid one gives, and what each faulty one is told."""

from __future__ import annotations

import contextlib
import json
import re
import subprocess
import tomllib
from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from symbolic_response.errors import NetworkError, QuantityError
from symbolic_response.expressions.reader import read_expression
from symbolic_response.network import Observable, State, SymbolEntry, Transition, math_latex
from symbolic_response.network.lines import key_lines
from symbolic_response.network.toml_reader import read_network, read_network_text

FULL = r'''# every section and key once
title = "Rectifier"
about = """
free [text]
[symbols.not_one]
"""

[symbols.c]
about = "concentration"
sign = "positive"
latex = 'c_{0}'
range = ["1/100", 1e2]
[symbols]
k_on = {}
k_off.about = "unbinding"
E = { sign = "real", range = [
   -2.5,   # low
   "3" ] }
[symbols."B_flip"]
sign = "real"
[symbols.lambda]
sign = "real"
[symbols.extra]

[states.A]
energy = "E"
latex = "A_0"
[states.B]
energy = 0.1
[states.C]

[[transitions]]
name = "bind"
between = ["A", "B"]
rates = ["k_on*c", "k_off"]
[[transitions]]
name = "flip"
between = ["B", "A"]
barrier = "B_flip"
drive = "lambda"
[[transitions]]
between = ["B", "C"]
rates = [2]
[[transitions]]
between = ["C", "A"]
rates = ["1/3 + k_on",
  1_000]

[observables.occupancy]
B = "1/2"
C = -3

[[hand]]
quantity = "p[A]"
latex = '\frac{1}{2}'
any.thing = [1.5, 1979-05-27]
[[inequality]]
text = "2*extra"
[[control]]
[appendix]
paper = "x"
[notation]
'''

RING = """title = "ring"
[symbols.k]
[symbols.E]
sign = "real"
[states.A]
energy = "E"
[states.B]
energy = 1
[states.C]
[[transitions]]
name = "bind"
between = ["A", "B"]
rates = ["k", 2]
[[transitions]]
between = ["B", "C"]
rates = ["k", 1]
[[transitions]]
name = "close"
between = ["C", "A"]
rates = [3, "1/2"]
"""


def test_valid_file() -> None:
    network = read_network_text(FULL, "full.toml")
    read = read_expression
    assert (network.title, network.path) == ("Rectifier", "full.toml")
    assert network.about == "free [text]\n[symbols.not_one]\n"
    small, large = Fraction(1, 1000), Fraction(1000)
    assert network.symbols == (
        SymbolEntry("c", True, Fraction(1, 100), Fraction(100), "concentration", "c_{0}"),
        SymbolEntry("k_on", True, small, large),
        SymbolEntry("k_off", True, small, large, "unbinding"),
        SymbolEntry("E", False, Fraction(-5, 2), Fraction(3)),
        SymbolEntry("B_flip", False, Fraction(-5), Fraction(5)),
        SymbolEntry("lambda", False, Fraction(-5), Fraction(5)),
        SymbolEntry("extra", True, small, large),
    )
    assert network.states == (
        State("A", read("E"), "A_0"), State("B", read("1/10")), State("C")
    )
    assert network.transitions == (
        Transition("bind", 0, 1, read("k_on*c"), read("k_off")),
        Transition("flip", 1, 0, read("exp(1/10 - B_flip + lambda/2)"),
                   read("exp(E - B_flip - lambda/2)"), read("B_flip"), read("lambda")),
        Transition("B_C", 1, 2, read("2"), None),
        Transition("C_A", 2, 0, read("1/3 + k_on"), read("1000")),
    )
    assert network.observables == (
        Observable("occupancy", (read("0"), read("1/2"), read("-3"))),
    )
    assert network.hand[0]["latex"] == r"\frac{1}{2}"
    assert network.inequality == ({"text": "2*extra"},) and network.control == ({},)
    assert network.appendix == {"paper": "x"} and network.notation == {}


def test_look_ups() -> None:
    network = read_network_text(FULL)
    assert network.positive_symbols == {"c", "k_on", "k_off", "extra"}
    assert network.state_index("C") == 2 and network.transition_index("flip") == 1
    assert network.symbol("E").positive is False
    assert network.observable("occupancy").name == "occupancy"
    with pytest.raises(QuantityError, match="no transition 'bnd'; did you mean 'bind'"):
        network.transition_index("bnd")
    with pytest.raises(QuantityError, match="no state 'zzz'; known: A, B, C"):
        network.state_index("zzz")


def test_newlines_and_byte_order_mark() -> None:
    assert read_network_text("\ufeff" + RING.replace("\n", "\r\n")) == read_network_text(RING)


def test_python_words_are_ordinary_names() -> None:
    text = RING.replace("[symbols.k]", "[symbols.None]").replace('"k"', '"None"')
    assert read_network_text(text).symbols[0].name == "None"


def ring(old: str, new: str) -> str:
    assert RING.count(old) >= 1
    return RING.replace(old, new, 1)


FIRST = 'rates = ["k", 2]'  # on line 13
FAULTY = [
    ("", 1, "title is missing; write title"),
    (ring('"ring"', '""'), 1, "title is not a line of text"),
    (ring('"ring"', "3"), 1, "title is not a line of text"),
    (ring('"ring"', "1.5"), 1, "title is not a line of text"),
    (ring('"ring"', '"ring"\nabout = 1'), 2, "about is a number; write a text"),
    (ring("[symbols.k]", "[symbol.k]"), 2, "no key 'symbol'; did you mean 'symbols'"),
    (ring('"ring"', '"ring"\nsymbols = 3'), 3, r"not valid TOML: .*column"),
    ('title = "x"\nsymbols = 3', 2, r"symbols is a number; write tables such as \[symbols.NAME\]"),
    ('title = "x"\n\nstates = ["A", "B"]', 3, r"states is an array; write tables such as"),
    ('title = "x"\n[states]\nA = {}\nB = "b"', 4, r"state 'B' is a text; write a table"),
    ('title = "x"\n[states.A]', 2, "at least two states"),
    ('title = "x"\n[states.A]\n[states.B]', 2, "'A' takes part in no transition"),
    (ring("[states.A]", "[states.1A]"), 5, "state name '1A': write an ASCII letter"),
    (ring("[states.A]", '[states."A é"]'), 5, "state name 'A é': write an ASCII letter"),
    (ring("[states.C]", "[states.C]\nenergie = 1"), 10, "no key 'energie'; did you mean 'energy'"),
    (ring("energy = 1", "energy = true"), 8, "state 'B': energy is true; write an exact number"),
    (ring("energy = 1", "energy = 1979-05-27"), 8, "energy is a date or time"),
    (ring("energy = 1", "energy = nan"), 8, "energy is nan; write a finite number"),
    (ring("energy = 1", "energy = -inf"), 8, "energy is -inf; write a finite number"),
    (ring("energy = 1", "energy = 1e999999"), 8, "more than 1000 digits"),
    (ring("energy = 1", "energy = 1/0"), 8, "not valid TOML: .*column 11"),
    (ring("energy = 1", 'energy = "1/0"'), 8, "energy: division by zero, at character 2 of '1/0'"),
    (ring("energy = 1", 'energy = "1/(E - E)"'), 8, "energy: .*zero"),
    (ring("energy = 1", 'energy = "E^2"'), 8, r"'\^' does not belong .*write \*\*"),
    (ring("energy = 1", 'energy = "F"'), 8, "the symbol 'F' is not declared; "),
    (ring("energy = 1", 'energy = "p"'), 8, "'p' is not declared; this word is reserved"),
    (ring("[symbols.k]", "[symbols.mean]"), 2, "symbol 'mean': this word is reserved"),
    (ring("[symbols.k]", "[symbols.k-1]"), 2, "symbol name 'k-1': write"),
    (ring("[symbols.k]", "[symbols]\nk = 3"), 3, "symbol 'k' is a number; write"),
    (ring('sign = "real"', 'sign = "negative"'), 4, "sign is 'negative'; write \"positive\""),
    (ring('sign = "real"', "sign = 1"), 4, "sign is 1; write"),
    (ring('sign = "real"', 'sing = "real"'), 4, "no key 'sing'; did you mean 'sign'"),
    (ring("[symbols.k]", "[symbols.k]\nrange = [1]"), 3, "not an array of two entries"),
    (ring("[symbols.k]", "[symbols.k]\nrange = 1"), 3, "not an array of two entries"),
    (ring("[symbols.k]", "[symbols.k]\nrange = [2, 1]"), 3, "range runs from 2 up to 1"),
    (ring("[symbols.k]", "[symbols.k]\nrange = [1, 1]"), 3, "range runs from 1 up to 1"),
    (ring("[symbols.k]", "[symbols.k]\nrange = [1, inf]"), 3, "range is inf; write a finite"),
    (ring("[symbols.k]", "[symbols.k]\nrange = [0, 1.5]"), 3, "begins at 0, .* is positive"),
    (ring("[symbols.k]", '[symbols.k]\nrange = [1,\n"ln(2)"]'), 4, "'ln\\(2\\)' .* not an exact"),
    (ring("[symbols.k]", "[symbols.k]\nrange = [false, 1]"), 3, "range is false; write"),
    (ring("[symbols.k]", "[symbols.k]\n[symbols.spare]"), 3, "'spare' is declared but not used"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = 'k_{'"), 3, r"latex 'k_\{' cannot stand"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = '$k$'"), 3, "cannot stand in a formula"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = 'k^'"), 3, "cannot stand in a formula"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = '{k_ }a'"), 3, "cannot stand in a formula"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = '\\newwrite\\x\\immediate\\openout\\x=a'"), 3,
     r"symbol 'k': latex holds \\newwrite, which is not allowed; use"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = 'k_{\\immediate\\openout1=a}'"), 3, r"\\immediate,"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = '\\input{/etc/hostname}'"), 3, r"holds \\input,"),
    (ring("[states.B]", "[states.B]\nlatex = '\\text{\\input{x}}'"), 8, r"state 'B': .* \\input,"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = '^^5cinput{x}'"), 3, r"latex holds \^\^, which"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = 'k^^^^005cinput'"), 3, r"latex holds \^\^, which"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = '\\csname input\\endcsname x'"), 3, r"\\csname,"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = '\\begin{input}'"), 3, r"holds \\begin,"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = '\\mathrmx'"), 3, r"holds \\mathrmx,"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = 'k\\\\input'"), 3, r"holds \\\\, which"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = '\\" + "a" * 500 + "'"), 3, r"\\a{39}\.\.\., which"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = 'k@'"), 3, "latex holds @, which"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = 'k~x'"), 3, "latex holds ~, which"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = 'κ'"), 3, "latex holds κ, which"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = ''"), 3, "latex is not a line of text"),
    (ring("[symbols.k]", "[symbols.k]\nlatex = 'E'"), 4, "'k' and 'E' look the same in LaTeX"),
    (ring("[states.B]", "[states.B]\nlatex = 'C'"), 10, "states 'B' and 'C' look the same"),
    (ring(FIRST, 'rates = ["q", 2]'), 13, "transition 'bind': forward rate: .* 'q' is not"),
    (ring(FIRST, 'rates = ["kk", 2]'), 13, "'kk' is not declared; did you mean 'k'"),
    (ring(FIRST, 'rates = "k"'), 13, "rates is not an array of two rates"),
    (ring(FIRST, "rates = []"), 13, "rates is not an array of two rates"),
    (ring(FIRST, 'rates = ["k", 1, 2]'), 13, "rates is not an array of two rates"),
    (ring(FIRST, 'rates = ["k", 0]'), 13, "backward rate is zero .*leave it out for one-way"),
    (ring(FIRST, 'rates = ["k - k", 1]'), 13, "forward rate is zero for all values"),
    (ring(FIRST, 'rates = ["k",\n "-k"]'), 14, "backward rate is negative for all values"),
    (ring(FIRST, 'rates = ["k"\n, "k +* 2"]'), 14, r"before '\*', at character 4 of 'k \+\* 2'"),
    (ring(FIRST, 'rates = ["' + "k + " * 50 + ')", 1]'), 13,
     r"at character 201 of '\.\.\.k \+ k \+ k \+ k \+ k \+ \)'$"),
    (ring(FIRST, 'rates = ["__import__(0)", 2]'), 13, "'_' does not belong"),
    (ring(FIRST, 'rates = ["k.real", 2]'), 13, r"'\.' does not belong"),
    (ring(FIRST, 'rates = ["' + "(" * 100_000 + '", 2]'), 13, "nested more than"),
    (ring(FIRST, "rates = [[1], 2]"), 13, "forward rate is an array; write"),
    (ring(FIRST, 'rates = [k, "k"]'), 13, "not valid TOML: Invalid value at column .*quotes"),
    (ring(FIRST, FIRST + '\nbarrier = "E"'), 14, "has both rates and barrier; keep rates"),
    (ring(FIRST, FIRST + "\ndrive = 1"), 14, "has both rates and drive"),
    (ring(FIRST, "drive = 1"), 10, "has no rates; write rates"),
    (ring('rates = ["k", 1]', "barrier = 1"), 16,
     r"'B_C' has a barrier, but state 'C' has no energy; add energy to \[states.C\]"),
    (ring(FIRST, FIRST + "\nrate = 1"), 14, "no key 'rate'; did you mean 'rates'"),
    (ring('name = "bind"', "name = 1"), 11, "transition name 1: write"),
    (ring('name = "bind"', 'name = "close"'), 18, "'close' is taken by transition 1"),
    (ring('name = "close"\nbetween = ["C", "A"]', 'between = ["B", "C"]'), 17,
     "'B_C' is taken by transition 2; give it a name of its own"),
    (ring('["A", "B"]', '["A", "A"]'), 12, "joins 'A' to itself"),
    (ring('["A", "B"]', '["A", "Bb"]'), 12, "'Bb' is not a state; did you mean 'B'"),
    (ring('["A", "B"]', '["A", 1]'), 12, "1 is not a state; add a table"),
    (ring('["A", "B"]', '["A"]'), 12, "between is not an array of two states"),
    (ring('between = ["A", "B"]\n', ""), 10, "does not say which states it joins"),
    (ring("[[transitions]]", "[transitions]"), 14, "not valid TOML"),
    (RING.partition("[[")[0] + "[transitions]", 10, r"transitions is a table; begin"),
    ("transitions = [1]\n" + RING.partition("[[")[0], 1, "transition 1 is a number; begin"),
    (ring(', "1/2"]', "]").replace('["k", 1]', '["k"]').replace('["C", "A"]', '["A", "C"]'), 9,
     "state 'C' is absorbing: no rate leaves it"),
    (ring(FIRST, 'rates = ["k"]').replace('["C", "A"]', '["B", "C"]'), 5,
     "state 'A' cannot be reached: no rate leads to it"),
    (ring("[states.C]", "[states.C]\n[states.D]\n[states.G]") + '[[transitions]]\n'
     'between = ["D", "G"]\nrates = [1, 1]\n', 10, "states 'D', 'G' cannot be reached from 'A'"),
    (ring("[states.C]", "[states.C]\n[states.D]\n[states.G]") + '[[transitions]]\n'
     'between = ["D", "G"]\nrates = [1, 1]\n[[transitions]]\nbetween = ["A", "D"]\nrates = [1]\n',
     10, "states 'D', 'G' can be reached from but cannot return to 'A'"),
    (RING + "[observables]\nn = 1\n", 22, "observable 'n' is a number; write a table"),
    (RING + "[observables.n]\nX = 1\n", 22, "observable 'n' has no state 'X'"),
    (RING + '[observables.n]\nA = "k +"\n', 22, "observable 'n' in state 'A': .* ends where"),
    (RING + "[observables.n-1]\nA = 1\n", 21, "observable name 'n-1'"),
    (RING + "[hand]\na = 1\n", 21, r"hand is a table; begin each entry with \[\[hand\]\]"),
    (RING + "[[appendix]]\na = 1\n", 21, "appendix is an array; write a table"),
    (RING + "[hands]\n", 21, "no key 'hands'; did you mean 'hand'"),
    (RING + "[states.A]\n", 21, "Cannot declare .* keep one"),
    (ring("energy = 1", "energy = 1\nenergy = 2"), 9, "Cannot overwrite a value .* keep one"),
    (ring("energy = 1", 'energy = "1'), 8, "not valid TOML: Illegal character .*close the quotes"),
    (ring("energy = 1", "energy ="), 8, "not valid TOML: Invalid value"),
    (ring("energy = 1", "energy"), 8, "write KEY = VALUE"),
    (ring("energy = 1", r'energy = "\kappa"'), 8, "Unescaped .* in single quotes"),
    (ring("[symbols.k]", '[symbols.k]\nlatex = "\\tau"'), 3, r"latex '\\tau' holds a control"),
    (ring("energy = 1", "energy = " + "9" * 5000), 8, "more than 1000 digits"),
    (ring("energy = 1", "energy = 0x" + "f" * 900_000), 8, "longer than 100000 bits"),
    (ring("energy = 1", "a." * 60_000 + "a = 1"), 8, "more than 100 parts"),
    (RING + "x = '''\n", 21, "not valid TOML: .*end of the file; close the quotes"),
    (RING + "[x\n", 21, "close the name of the table as it was opened"),
    (RING + "[[é]]\n", 21, "Invalid initial character .*begin a name with a letter"),
    (RING + 'x = """\n', 21, "not valid TOML: .*end of the file"),
    (ring('"ring"', '"ri\0ng"'), 1, "not valid TOML: Illegal character"),
]


@pytest.mark.parametrize(("text", "line", "message"), FAULTY, ids=range(len(FAULTY)))
def test_faulty(text: str, line: int, message: str) -> None:
    with pytest.raises(NetworkError) as caught:
        read_network_text(text, "dir/net.toml")
    said = str(caught.value)
    assert len(said.splitlines()) == 1 and len(said) < 600
    assert said.startswith(f"dir/net.toml:{line}: "), said
    assert re.search(message, said), said


def test_every_command_that_is_allowed_compiles(tmp_path, requires_latex) -> None:
    sized = {r"\left", r"\right", r"\big", r"\Big", r"\bigl", r"\bigr", r"\Bigl", r"\Bigr"}
    lines = [rf"${command}{{x}}{{y}}$" for command in sorted(math_latex._COMMANDS - sized)]
    lines += [r"$\left(x\right) \big(\Big(\bigl(\bigr)\Bigl(\Bigr)$"]
    (tmp_path / "all.tex").write_text("\n\n".join([
        r"\documentclass{article}\usepackage{amsmath,amssymb}\begin{document}", *lines,
        "\\end{document}\n"]))
    done = subprocess.run(["pdflatex", "-halt-on-error", "-interaction=nonstopmode", "all.tex"],
                          cwd=tmp_path, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout[-1000:]


@pytest.mark.parametrize("latex", [
    r"k_{\mathrm{on}}", r"\varnothing", r"\hat{k}_{+1}", r"k_{\text{off}}", "A'", r"k\_x\ y",
    r"\left\{a\,b\right\}", r"\operatorname{Ca}^{2+}", r"\tfrac{1}{2}", r"E\|\text{S:ATP}\_",
    r"[\mathrm{S}]/2*<|>=(;)", r"\%\&"])
def test_usual_latex_is_allowed(latex: str) -> None:
    text = ring("[symbols.k]", f'[symbols.k]\nlatex = {json.dumps(latex)}')
    assert read_network_text(text).symbols[0].latex == latex


def test_deep_arrays() -> None:
    with pytest.raises(NetworkError, match=r"^<text>: .*nested too deeply"):
        read_network_text(RING + "[appendix]\nx = " + "[" * 100_000 + "]" * 100_000)


def test_files(tmp_path) -> None:
    file = tmp_path / "net.toml"
    file.write_text(RING)
    assert read_network(file) == read_network(str(file)) == read_network_text(RING)
    with pytest.raises(NetworkError, match="this is a folder"):
        read_network(tmp_path)
    with pytest.raises(NetworkError, match=r"none.toml: no such file or directory; name"):
        read_network(tmp_path / "none.toml")
    with pytest.raises(NetworkError, match="cannot be a file name"):
        read_network("a\0b\n")
    with pytest.raises(NetworkError, match="longer than 5000000 bytes"):
        read_network("/dev/zero")
    file.write_bytes(b"title = 'x'\nabout = '\xff'")
    with pytest.raises(NetworkError, match=r"net.toml:2: the byte 0xff is not UTF-8"):
        read_network(file)
    file.write_bytes(b"")
    with pytest.raises(NetworkError, match=r"net.toml:1: title is missing"):
        read_network(file)


def test_numbers_are_exact() -> None:
    text = ring("energy = 1", "energy = 1_0.10e-2")
    assert read_network_text(text).states[1].energy == read_expression("101/1000")


def test_lines_of_nested_values() -> None:
    text = (
        'a.b = 1\n[[t]]\nx = [{y = 1, "z z" = [\n2, 3.5]},\n#]\n"]"]\n'
        "[[t]]\n[t.s]\nq = \"\"\"\n[u]\n\"\"\"\"\"\nr = 1\n"
    )
    lines = key_lines(text)
    assert lines[("a", "b")] == 1 and lines[("t", 0, "x", 0, "y")] == 3
    assert lines[("t", 0, "x", 0, "z z", 1)] == 4 and lines[("t", 0, "x", 1)] == 6
    assert lines[("t", 1)] == 7 and lines[("t", 1, "s", "q")] == 9
    assert lines[("t", 1, "s", "r")] == 12
    assert set(lines) == places(tomllib.loads(text))


def places(document: object) -> set[tuple[str | int, ...]]:
    """Return the place of everything in a document, except of the document itself."""
    found: set[tuple[str | int, ...]] = set()
    pending: list[tuple[tuple[str | int, ...], object]] = [((), document)]
    while pending:
        place, part = pending.pop()
        found.add(place)
        if isinstance(part, dict | list):
            entries = part.items() if isinstance(part, dict) else enumerate(part)
            pending.extend(((*place, key), entry) for key, entry in entries)
    return found - {()}


def test_words_kept_sections_use() -> None:
    text = ring("[symbols.k]", "[symbols.k]\n[symbols.spare]\n[symbols.other]")
    read_network_text(text + "[notation]\nspare = 'other/2'\n")
    with pytest.raises(NetworkError, match="'spare' is declared but not used"):
        read_network_text(text + "[notation]\nspares = 'other/2'\n")


@settings(max_examples=300, deadline=None)
@given(data=st.data())
def test_mutated_files_are_answered(tmp_path_factory, data) -> None:
    raw = bytearray(FULL.encode())
    for _ in range(data.draw(st.integers(1, 4))):
        start = data.draw(st.integers(0, len(raw)))
        length = data.draw(st.integers(0, 12))
        alphabet = st.sampled_from([*b'"\'[]{}=.,#\n\r\t \\k1-\x00\xff', 0xC3, 0xA9])
        raw[start : start + length] = bytes(data.draw(st.lists(alphabet, max_size=3)))
    with contextlib.suppress(ValueError):
        text = raw.decode().replace("\r\n", "\n")
        assert places(tomllib.loads(text)) == set(key_lines(text))
    file = tmp_path_factory.getbasetemp() / "mutated.toml"
    file.write_bytes(bytes(raw))
    try:
        read_network(file)
    except NetworkError as error:
        assert len(str(error).splitlines()) == 1
        assert re.match(r"\S+mutated\.toml(:[0-9]+)?: ", str(error))
