"""Every error the package raises on purpose: one base, one class per meaning.

Each message is one line that says what is wrong and what to write instead.
"""

from __future__ import annotations


class SymbolicResponseError(Exception):
    """Base of all errors raised on purpose by this package."""


class InputError(SymbolicResponseError):
    """The input cannot be used as it stands."""


class ExpressionError(InputError):
    """A text cannot be read as an expression, quantity or response.

    ``position`` counts characters from 0 in the text that was read, or is None.
    """

    def __init__(self, message: str, position: int | None = None) -> None:
        super().__init__(message)
        self.position = position


class FormulaError(ExpressionError):
    """A LaTeX formula cannot be read; ``line`` and ``column`` count from 1.

    ``excerpt`` is the line of the text (or the part of it around the place), ``pointer`` the place
    in the excerpt, from 0; ``source`` says where the text stands.
    """

    def __init__(
        self,
        message: str,
        line: int,
        column: int,
        excerpt: str = "",
        pointer: int = 0,
        source: str = "",
    ) -> None:
        before = f"{source}: " if source else ""
        super().__init__(f"{before}line {line}, column {column}: {message}")
        self.message, self.line, self.column = message, line, column
        self.excerpt, self.pointer = excerpt, pointer

    def pointed(self) -> str:
        """Return the excerpt and, below it, a caret under the place."""
        return f"{self.excerpt}\n{' ' * self.pointer}^"


class NetworkError(InputError):
    """A network, or the file that describes it, breaks a rule."""


class QuantityError(InputError):
    """A quantity names something that the network does not have, or does not exist for it."""


class AssignmentError(InputError):
    """A value given to a symbol cannot be used."""


class EvaluationError(InputError):
    """A quantity has no value at a point: a division by zero, a rate that is not positive ..."""


class OutputError(InputError):
    """An output file cannot be written."""


class RefutedError(SymbolicResponseError):
    """Something that was to be shown does not hold; the message gives the exact point."""


class SizeLimitError(SymbolicResponseError):
    """An answer exists but is beyond a stated limit; the message gives the number."""


class UndecidedError(SymbolicResponseError):
    """A question was not settled within the precision allowed."""
