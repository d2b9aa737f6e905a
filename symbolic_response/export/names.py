"""Names that are safe in Python: no keywords, no two alike, none that hides what is needed."""

from __future__ import annotations

import builtins
import keyword
import re
from collections.abc import Iterable, Mapping

RESERVED_GLOBALS = frozenset(dir(builtins)) | {
    "Fraction", "FUNCTIONS", "SYMBOLS", "rates", "steady_state"}
MAX_NAME = 60


def argument_names(symbols: Iterable[str]) -> dict[str, str]:
    """Return the name of the argument that stands for each symbol of the file.

    A symbol's own name, followed by ``_`` where Python has a use for it.

    >>> argument_names(["lambda", "lambda_", "Fraction", "np"])
    {'lambda': 'lambda__', 'lambda_': 'lambda_', 'Fraction': 'Fraction_', 'np': 'np'}
    """
    names = list(symbols)
    taken = {name for name in names if _free(name)}
    found: dict[str, str] = {}
    for name in names:
        safe = name
        while not _free(safe) or (safe != name and safe in taken):
            safe += "_"
        taken.add(safe)
        found[name] = safe
    return found


def _free(name: str) -> bool:
    return not keyword.iskeyword(name) and name != "Fraction"


class Unused:
    """Gives out names that are not taken, each once."""

    def __init__(self, taken: Iterable[str]) -> None:
        self.taken = set(taken)

    def take(self, wanted: str) -> str:
        """Return the name wanted, or that name with a number."""
        name, count = wanted, 1
        while name in self.taken or keyword.iskeyword(name):
            count += 1
            name = f"{wanted}_{count}"
        self.taken.add(name)
        return name


def function_name(quantity: str) -> str:
    """Return a name made of the words of a quantity.

    >>> function_name("d ln(p[open]/p[loaded]) / d ln c")
    'd_ln_p_open_over_p_loaded_by_ln_c'
    >>> function_name("-2*current[take]**2 + 1/2")
    'minus_2_times_current_take_pow_2_plus_1_over_2'
    """
    words = re.sub(r"/\s*d\b", " by ", quantity)
    for sign, word in (("**", "pow"), ("*", "times"), ("/", "over"), ("+", "plus"),
                       ("-", "minus"), (".", "point")):
        words = words.replace(sign, f" {word} ")
    name = "_".join(re.findall(r"[A-Za-z0-9_]+", words))
    if len(name) > MAX_NAME:
        name = name[:MAX_NAME].rstrip("_")
    return name if name[:1].isalpha() else f"quantity_{name}"


def function_names(quantities: Iterable[str]) -> Mapping[str, str]:
    """Return a function name for each quantity, no two alike."""
    unused = Unused(RESERVED_GLOBALS)
    return {text: unused.take(function_name(text)) for text in quantities}
