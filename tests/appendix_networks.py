"""Networks for the tests of the document: as texts of the file format."""

from __future__ import annotations

from itertools import combinations

RING = r"""
title = "Three-state rectifier"
about = "A receptor that binds a ligand, changes its shape and resets."
[symbols]
k_on = {about = "binding rate constant", latex = 'k_{\mathrm{on}}'}
k_off = {about = "unbinding rate", latex = 'k_{\mathrm{off}}'}
c = {about = "concentration over its reference"}
a = {about = "rate of the change of shape"}
b = {about = "rate of the reverse change"}
g = {about = "reset rate"}
h = {about = "rate against the reset"}
[states.A]
[states.B]
[states.C]
[[transitions]]
name = "bind"
between = ["A", "B"]
rates = ["k_on*c", "k_off"]
[[transitions]]
name = "flip"
between = ["B", "C"]
rates = ["a", "b"]
[[transitions]]
name = "reset"
between = ["C", "A"]
rates = ["g", "h"]
[observables.occ]
B = 1
C = "1/2"
"""

ENERGY = """
title = "Two mechanisms between two states, and a third state"
[symbols]
E_A = {sign = "real"}
E_B = {sign = "real"}
E_C = {sign = "real"}
B_1 = {sign = "real"}
B_2 = {sign = "real"}
B_3 = {sign = "real"}
F = {sign = "real"}
[states.A]
energy = "E_A"
[states.B]
energy = "E_B"
[states.C]
energy = "E_C"
[[transitions]]
name = "one"
between = ["A", "B"]
barrier = "B_1"
drive = "F"
[[transitions]]
name = "two"
between = ["B", "A"]
barrier = "B_2"
[[transitions]]
name = "side"
between = ["B", "C"]
barrier = "B_3"
"""

ONE_WAY = """
title = "Irreversible turnover"
[symbols]
k1 = {}
k2 = {}
k3 = {}
s = {}
K = {}
[states.E]
[states.ES]
[states.EP]
[[transitions]]
between = ["E", "ES"]
rates = ["k1*s*(1 + s/K)", "k2"]
[[transitions]]
between = ["ES", "EP"]
rates = ["k2", "k3"]
[[transitions]]
name = "release"
between = ["EP", "E"]
rates = ["k3"]
[observables.bound_1]
ES = "s"
EP = 1
"""

NUMBERS = """
title = "Numbers only"
[states.A]
[states.B]
[states.C]
[[transitions]]
between = ["A", "B"]
rates = [2, 1]
[[transitions]]
between = ["B", "C"]
rates = [3, 1]
[[transitions]]
between = ["C", "A"]
rates = [1, 5]
[observables.position]
B = 1
C = 2
"""

PAIR = """
title = "Two states"
[symbols.k]
[symbols.D]
[symbols.N_A]
[states.A]
[states.B]
[[transitions]]
name = "hop"
between = ["A", "B"]
rates = ["k*N_A", "D"]
"""

ODD = r"""
title = "Functions, roots, fractions, own LaTeX, letters that are taken"
[symbols]
a = {latex = '\hat{k}_{+1}'}
b = {latex = 'k_{\text{off}}'}
pi_A = {}
W = {}
[states.A]
[states.B]
[states.CC]
[[transitions]]
between = ["A","B"]
rates = ["a*ln(1+b)", "b**(1/2)"]
[[transitions]]
between = ["B","CC"]
rates = ["pi_A", "W + a"]
[[transitions]]
between = ["CC","A"]
rates = ["1/3", "2*W**2"]
[[transitions]]
name="par_2"
between = ["CC","A"]
rates = ["0.1*a", "2*a/(b+W)"]
[observables.n_1]
A = "-2"
B = "ln(a)"
"""


def of_graph(title: str, states: list[str], pairs: list[tuple[str, str]], extra: str = "") -> str:
    """Return a network with one symbol for each directed rate of a graph."""
    lines = [f'title = "{title}"']
    for first, second in pairs:
        lines += [f"[symbols.w_{first}{second}]", f"[symbols.w_{second}{first}]"]
    lines += [f"[states.{state}]" for state in states]
    for first, second in pairs:
        lines += ["[[transitions]]", f'between = ["{first}", "{second}"]',
                  f'rates = ["w_{first}{second}", "w_{second}{first}"]']
    return "\n".join(lines) + "\n" + extra


K4 = of_graph("Complete graph on four states", list("ABCD"), list(combinations("ABCD", 2)))


def cube() -> str:
    """Return the graph of the cube, 384 spanning trees."""
    states = [f"s{bits:03b}" for bits in range(8)]
    pairs = [
        (f"s{bits:03b}", f"s{bits | 1 << place:03b}")
        for bits in range(8) for place in range(3) if not bits >> place & 1
    ]
    return of_graph("Cube", states, pairs, "[observables.top]\ns111 = 1\n")


def long_names() -> str:
    """Return a ring of eight states whose rates have long names and long expressions."""
    lines = ['title = "Long names"', "[symbols]"]
    lines += [f"catalytic_{k} = {{}}\nbackward_rate_{k} = {{}}\nG_{k} = {{sign = 'real'}}"
              for k in range(8)]
    lines += [f"[states.conformation{k}]" for k in range(8)]
    for k in range(8):
        forward = f"catalytic_{k}*(1 + catalytic_{(k + 1) % 8}*backward_rate_{k})*exp(-G_{k}/3)"
        lines += ["[[transitions]]", f'name = "step_number_{k}"',
                  f'between = ["conformation{k}", "conformation{(k + 1) % 8}"]',
                  f'rates = ["{forward}", "backward_rate_{k}"]']
    return "\n".join(lines) + "\n"


def long_energy() -> str:
    """Return a ring of nine states in energy form."""
    lines = ['title = "Ring in energy form"', "[symbols]"]
    for k in range(9):
        lines += [f"E_state{k} = {{sign = 'real'}}", f"B_step{k} = {{sign = 'real'}}",
                  f"F_step{k} = {{sign = 'real'}}"]
    for k in range(9):
        lines += [f"[states.s{k}]", f'energy = "E_state{k}"']
    for k in range(9):
        lines += ["[[transitions]]", f'name = "step{k}"',
                  f'between = ["s{k}", "s{(k + 1) % 9}"]',
                  f'barrier = "B_step{k}"', f'drive = "F_step{k}"']
    return "\n".join(lines) + "\n"


ALL = {
    "ring": RING, "energy": ENERGY, "one_way": ONE_WAY, "numbers": NUMBERS, "pair": PAIR,
    "odd": ODD, "k4": K4, "cube": cube(), "long_names": long_names(),
    "long_energy": long_energy(),
}
