"""Hostile sizes: an answer or a one-line error of the package, soon and in little memory."""

import subprocess
import sys
from itertools import product

import pytest

from symbolic_response.errors import SizeLimitError, SymbolicResponseError
from symbolic_response.expressions.derivative import by_symbol
from symbolic_response.expressions.enclosure import decimal_enclosure
from symbolic_response.expressions.latex import expression_latex
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.ring import Domain, product_of
from symbolic_response.expressions.signs import certain_sign
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import Expression, number, substitute, symbols_of

HUGE = "((10**64)**64)**2"  # 8,193 digits, more than Python turns into decimal text
BOMBS = {
    "power of a sum": "((a+b+c+d)**64)**2",
    "power of a power of a sum": "((a+b+c+d)**64)**64",
    "towers of powers": "(((((((a**64)**64)**64)**64)**64)**64)**64)**64",
    "towers of powers of a sum": "(((((((a+1)**64)**64)**64)**64)**64)**64)**64",
    "nested powers of sums": "((((((a+b)**8+c)**8+d)**8+1)**8+a)**8+b)**8",
    "exp nested": "exp(" * 58 + "a" + ")" * 58,
    "exp tower": "exp(" * 58 + "1" + ")" * 58,
    "ln nested": "ln(" * 58 + "a + 1" + ")" * 58,
    "ln of exp nested": "ln(1 + exp(" * 29 + "a" + "))" * 29,
    "sqrt nested": "sqrt(a + " * 50 + "b" + ")" * 50,
    "sqrt nested in numbers": "sqrt(2 + " * 58 + "2" + ")" * 58,
    "sqrt nested, sign unknown": "x + y*sqrt(" * 58 + "a" + ")**3" * 58,
    "roots of primes": "1/(" + "+".join(f"sqrt({p})" for p in (2, 3, 5, 7, 11, 13, 17)) + ")**7",
    "roots of different index": "1/(" + "+".join(f"a**(1/{p})" for p in range(41, 65)) + ")",
    "continued fraction": "".join(f"1/(a{i} + " for i in range(58)) + "b" + ")" * 58,
    "ln of a product": "ln(" + "*".join(f"(a{i} + b{i})" for i in range(300)) + ")",
    "ln of a big power": "ln((" + "+".join(f"a{i}" for i in range(60)) + ")**64)",
    "different denominators": "+".join(f"1/(a{i} + b{i})" for i in range(60)),
    "many symbols": "exp(" + "+".join(f"a{i}*b{i}" for i in range(1500)) + ")",
    "fine exponents":
        "exp(a/1234567891011121314151617181920) + exp(a/98765432109876543210123456789)",
    "quotient of fine exponents":
        "(exp(a/123456789) + exp(a/987654321))/(exp(a/1234567) + exp(a/7654321) + 1)",
    "exp of a huge number": "exp(10**50)",
    "quotient of huge exponentials": "(exp(10**50) - 1)/(exp(1) - 1)",
    "quotient of long exponentials": "(exp(10**7*x) - 1)/(exp(x) - 1)",
    "reciprocal of a large exponential": "1/(exp(10**6) - 1)",
    "root of a huge exponential": "sqrt(1 + exp(10**50*x))",
    "root of a high power": "sqrt(1 + (a**64)**64)",
    "power by logarithm of a sum": "exp(10**6*ln(a + b))",
    "power by logarithm of a number": "exp(10**9*ln(2)) + exp(10**9/7*ln(3))",
    "power by logarithm of a symbol": "exp(10**64/7*ln(3*a))",
    "long number under a root": f"sqrt(c + {HUGE})",
    "long number under a logarithm": f"ln({HUGE} + 7) + ln(c + {HUGE})",
    "long number in an exponent": f"exp({HUGE}*ln(c)) + exp(1/(c + {HUGE}))",
    "long semiprime": "sqrt(18446744073709551557*18446744073709551533*(10**60 + 7))",
}


def everything(node: Expression) -> None:
    """Do all that the package does with an expression; let only its own errors pass."""
    names = tuple(sorted(symbols_of(node)))
    positive = frozenset(name for name in names if name not in "xy")
    for work in (
        lambda: normal_form(node, Domain(names, positive)).as_fraction(),
        lambda: certain_sign(node, positive),
        lambda: None if names else decimal_enclosure(node),
        lambda: read_expression(expression_text(node)),
        lambda: expression_latex(node, {name: name for name in names}),
        lambda: expression_text(by_symbol(node, names[0])) if names else None,
    ):
        try:
            work()
        except SymbolicResponseError as error:
            assert "\n" not in str(error)
            assert len(str(error)) < 300


def answer_all(names: list[str]) -> None:
    """Work through some of the bombs; run in a process of its own, with its limits."""
    import resource

    resource.setrlimit(resource.RLIMIT_AS, (2 << 30, 2 << 30))
    for name in names:
        signal_after(20)
        everything(read_expression(BOMBS[name]))


def signal_after(seconds: int) -> None:
    import signal

    signal.alarm(seconds)  # ends the process: FLINT does not return to Python in between


@pytest.mark.skipif(sys.platform == "win32", reason="limits of memory and time are POSIX")
@pytest.mark.parametrize("share", range(4))
def test_bombs(share: int) -> None:
    """Each within 20 s and 2 GB; a crash of the process is a failure as well."""
    names = list(BOMBS)[share::4]
    code = (
        "import importlib.util as u, sys;"
        f"s = u.spec_from_file_location('limits', {__file__!r}); m = u.module_from_spec(s);"
        f"s.loader.exec_module(m); m.answer_all({names!r})"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True)
    assert done.returncode == 0, done.stderr[-2000:]


def test_substitution_does_not_nest_without_end() -> None:
    """What is read may be substituted once; beyond the depth all functions stand it is refused."""
    deep, half = (read_expression("1+2*exp(" * n + "a" + ")**3" * n) for n in (59, 30))
    with pytest.raises(SizeLimitError, match="nested more than 250 deep"):
        substitute(deep, {"a": deep})
    everything(substitute(half, {"a": half}))
    assert substitute(deep, {"a": number(0)}) == read_expression(
        "1+2*exp(" * 59 + "0" + ")**3" * 59
    )


@pytest.mark.parametrize(
    ("text", "message"),
    [("((a + b + c + d)**64)**2", "term products"), (f"({HUGE})**64", "bits"),
     ("exp(10**9*ln(2))", "bits"),
     ("+".join(f"a{i}" for i in range(1200)), "different symbols")],
)
def test_limits_are_named(text: str, message: str) -> None:
    with pytest.raises(SymbolicResponseError, match=message) as caught:
        node = read_expression(text)
        names = tuple(sorted(symbols_of(node)))
        normal_form(node, Domain(names, frozenset(names)))
    assert "\n" not in str(caught.value)


def test_the_limit_of_a_product_is_cumulative() -> None:
    """Built from the answer: (a + b)^n has n + 1 terms, made from n (n + 1) / 2 * 2 products."""
    ring = normal_form(read_expression("a + b"), Domain(("a", "b"), frozenset("ab"))).ring
    a, b = (ring.context.gen(place) for place in (0, 1))
    assert len(product_of([(a + b, 9)], ring, 90)) == 10
    with pytest.raises(SizeLimitError, match="more than 89 term products"):
        product_of([(a + b, 9)], ring, 89)
    assert product_of([(a, 10**30)], ring, 1) == ring.monomial([10**30, 0])


REFUSED = ["", "a b", "a +* b", "sin(a)", "(" * 99 + "a", "1/0", "a**b", "2**65", "0**-1", "a\nb c",
           "a; b", "\x00", "a\r\n$", "9" * 1500, "exp()", "é"]


@pytest.mark.parametrize("text", REFUSED)
def test_messages_are_one_line(text: str) -> None:
    with pytest.raises(SymbolicResponseError) as caught:
        read_expression(text)
    assert len(str(caught.value).splitlines()) == 1
    assert len(str(caught.value)) < 300


def test_every_short_text_is_read_or_refused() -> None:
    """All texts of up to five tokens from a small stock: never an error of another kind."""
    stock = ["a", "2", "0", "+", "-", "**", "/", "(", ")", "sqrt(", "ln("]
    for length in range(1, 5):
        for tokens in product(stock, repeat=length):
            try:
                node = read_expression("".join(tokens))
            except SymbolicResponseError:
                continue
            assert read_expression(expression_text(node)) is not None
