"""What the functions of an exported module call, each a text that is put in where used."""

GIVEN = '''
def _given(*values):
    """Return the values: integers as exact fractions, but all as floats beside arrays of floats."""
    if any(isinstance(value, (list, tuple, str)) for value in values):
        raise TypeError("give numbers or NumPy arrays, no lists or texts")
    types = [getattr(value, "dtype", None) for value in values]
    if any(kind is not None and kind != object for kind in types):
        return [float(value) if isinstance(value, (int, Fraction)) else
                value.astype(float) if kind is not None and kind.kind in "iubO" else value
                for value, kind in zip(values, types)]
    return [Fraction(value) if isinstance(value, int) else value for value in values]
'''
FUNCTION = '''
def _{name}(value):
    if hasattr(value, "dtype"):
        import numpy
        return numpy.{numpy}(value.astype(float) if value.dtype == object else value)
    return {python}(value)
'''
ROOT = '''
def _root(value, n):
    """Return the n-th root; exact for squares of fractions."""
    if hasattr(value, "dtype"):
        return (value.astype(float) if value.dtype == object else value) ** (1/n)
    if isinstance(value, complex):
        return value ** (1/n)
    if value < 0:
        raise ValueError("a root of a negative number")
    if n == 2 and isinstance(value, (int, Fraction)):
        exact = Fraction(math.isqrt(value.numerator), math.isqrt(value.denominator))
        return exact if exact**2 == value else math.sqrt(value)
    return value ** (1/n)
'''
HELPERS = {key: text.strip() for key, text in {
    "_given(": GIVEN,
    "_exp(": FUNCTION.format(name="exp", numpy="exp", python="math.exp"),
    "_ln(": FUNCTION.format(name="ln", numpy="log", python="math.log"),
    "_root(": ROOT,
}.items()}
