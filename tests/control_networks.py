"""Networks with ``[[control]]`` entries for the appendix."""

from pathlib import Path

WORKED = Path(__file__).parent.parent / "worked_cases"


RING = """title = "Steered ring"
[symbols.c]
about = "concentration over its reference"
[states.s1]
latex = "1"
[states.s2]
latex = "2"
[states.s3]
latex = "3"
[states.s4]
latex = "4"
[[transitions]]
name = "a"
between = ["s1", "s2"]
rates = ["c", "2"]
[[transitions]]
name = "b"
between = ["s2", "s3"]
rates = ["3*c", "1"]
[[transitions]]
name = "d"
between = ["s3", "s4"]
rates = ["1/7", "2*c"]
[[transitions]]
name = "e"
between = ["s4", "s1"]
rates = ["1", "5*c"]
[observables.open]
s2 = 1
s3 = 1
[[control]]
parameter = "ln c"
from = "1/100"
to = "100"
[control.energies]
s1 = "1"
s2 = "1"
s4 = "1"
[[control.directed]]
rates = ["backward[a]"]
amount = "-1"
[[control.directed]]
rates = ["forward[e]"]
amount = "-1"
[appendix]
quantities = ["mean[open]", "d mean[open] / d ln c"]
"""

TIDE_LAMP = (WORKED / "tide_lamp" / "network.toml").read_text(encoding="utf-8") + """
[[control]]
parameter = "ln c"
from = "1/100"
to = "1000"
observables = ["mean[brightness]", "p[lit]"]
[control.at]
a = "2"
a_r = "1/3"
b = "5"
b_r = "0.1"
f = "1"
f_r = "0.01"
g = "0.2"
g_r = "1/20"
h = "1"
h_r = "0.001"
[[control]]
parameter = "c"
observables = ["mean[brightness]"]
[control.energies]
idle = "1/c"
[[control.directed]]
rates = ["backward[fade]", "backward[recover]"]
amount = "-1/c"
[[control.directed]]
rates = ["forward[spend]"]
amount = "1/c"
"""

DRIVEN = """title = "Driven motor"
[symbols.E]
sign = "real"
[symbols.F]
sign = "real"
latex = "F"
[symbols.k]
[states.A]
energy = "E"
[states.B]
energy = "0"
[states.C]
energy = "ln(3)"
[[transitions]]
name = "push"
between = ["A", "B"]
barrier = "0"
drive = "F"
[[transitions]]
name = "slip"
between = ["B", "C"]
rates = ["k", "1"]
[[transitions]]
name = "back"
between = ["C", "A"]
rates = ["1", "2*k"]
[[transitions]]
name = "pull"
between = ["A", "C"]
barrier = "2*ln(5)"
drive = "F"
[observables.load]
A = -1
C = 2
[[control]]
parameter = "F"
from = "-10"
to = "10"
points = 40
at = {E = "2*ln(3/2)", k = "1/2"}
[control.drives]
push = "1"
pull = "1"
"""

ONE_WAY = """title = "Enzyme with a one-way step"
[symbols.s]
about = "substrate"
latex = "s^{\\\\ast}"
[symbols.k_a]
[symbols.k_b]
[symbols.K]
[symbols.q_hi]
sign = "real"
[states.free]
[states.bound]
[states.done]
[states.side]
[[transitions]]
name = "bind"
between = ["free", "bound"]
rates = ["k_a*s", "k_b"]
[[transitions]]
name = "turn"
between = ["bound", "done"]
rates = ["1"]
[[transitions]]
name = "loose"
between = ["done", "free"]
rates = ["k_a", "k_b*s/(K + s)"]
[[transitions]]
name = "park"
between = ["done", "side"]
rates = ["s**2", "1"]
[observables.signal]
bound = "q_hi"
done = 1
[observables.shifted]
free = -1
done = 2
[[control]]
parameter = "ln s"
[[control]]
parameter = "ln K"
observables = ["mean[signal] - 2*p[done]", "p[free, done]"]
[[control]]
parameter = "k_b"
observables = ["p[free]"]
at = {s = "2", k_a = "1/3", K = "5", q_hi = "1"}
[[control]]
parameter = "q_hi"
observables = ["p[free]"]
at = {s = "2", k_a = "1/3", K = "5", k_b = "1"}
"""

LONG = """title = "Long polynomials"
[symbols.c]
[states.A]
[states.B]
[states.C]
[states.D]
[[transitions]]
between = ["A", "B"]
rates = ["123456789/1000003*c**3 + 17*c + 1/999983", "31/7*c**2 + 987654321/77"]
[[transitions]]
between = ["B", "C"]
rates = ["c**5 + 1234567891234/13*c + 1", "22/7"]
[[transitions]]
between = ["C", "D"]
rates = ["c**7 + 3141592653589793/11*c**2 + 1", "c"]
[[transitions]]
between = ["D", "A"]
rates = ["1", "c**2 + 2718281828459/19"]
[[control]]
parameter = "ln c"
from = 1
to = 2
points = 3
"""
