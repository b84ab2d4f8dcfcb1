"""Preferred values of IEC 60063 (E6, E12, E24), tabulated: the rounding formula is wrong for several of them."""

from typing import Literal

Series = Literal["E6", "E12", "E24"]

E6 = (10, 15, 22, 33, 47, 68)
E12 = (10, 12, 15, 18, 22, 27, 33, 39, 47, 56, 68, 82)
E24 = (10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91)
TABLES: dict[Series, tuple[int, ...]] = {"E6": E6, "E12": E12, "E24": E24}
LEAST_EXPONENT, MOST_EXPONENT = -15, 15


class StockValueError(ValueError):
    """There is no such series, or no stock value near the number asked for."""


def _candidates(series: Series, value: float) -> list[float]:
    """Return the stock values of the decade of ``value`` and of both its neighbours, rising."""
    if series not in TABLES:
        raise StockValueError(f"there is no series {series!r}; there are {', '.join(TABLES)}")
    if not 10.0 ** LEAST_EXPONENT <= value <= 10.0 ** MOST_EXPONENT:
        raise StockValueError(f"no stock value near {value}")
    exponent = int(f"{value:e}".split("e")[1])  # exact, unlike a logarithm
    # Dividing or multiplying once by an exact power of ten keeps 4700 and 0.047 what a person writes.
    return [step / 10.0 ** (1 - e) if e < 1 else step * 10.0 ** (e - 1)
            for e in (exponent - 1, exponent, exponent + 1) for step in TABLES[series]]


def nearest(series: Series, value: float) -> float:
    """Return the stock value nearest to ``value`` (the lower of two equally near), in the same unit.

    Raises StockValueError for an unknown series or a value outside 1e-15 to 1e15.
    """
    return min(_candidates(series, value), key=lambda stock: abs(stock - value))


def at_least(series: Series, value: float) -> float:
    """Return the smallest stock value not below ``value``, in the same unit.

    Raises StockValueError for an unknown series or a value outside 1e-15 to 1e15.
    """
    return next(stock for stock in _candidates(series, value) if stock >= value * (1.0 - 1e-12))


def at_most(series: Series, value: float) -> float:
    """Return the largest stock value not above ``value``, in the same unit.

    Raises StockValueError for an unknown series or a value outside 1e-15 to 1e15.
    """
    return next(stock for stock in reversed(_candidates(series, value)) if stock <= value * (1.0 + 1e-12))
