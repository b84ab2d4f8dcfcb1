"""Preferred values against IEC 60063 as tabulated by the eseries package 1.2.1."""

import eseries
import pytest

from sim import stock_values

SERIES = {"E6": eseries.E6, "E12": eseries.E12, "E24": eseries.E24}


@pytest.mark.parametrize("name", SERIES)
def test_tables_equal_the_package(name: str) -> None:
    assert list(stock_values.TABLES[name]) == list(eseries.series(SERIES[name]))


def test_rounding_formula_would_be_wrong() -> None:
    """The formula round(10**(i/24), 1) differs from IEC 60063 at i = 10 to 16 and 22 (from the same package)."""
    wrong = [i for i in range(24) if round(10 ** (i / 24) * 10) != stock_values.E24[i]]
    assert wrong == [10, 11, 12, 13, 14, 15, 16, 22]


@pytest.mark.parametrize(("choose", "series", "value", "expected"), [
    (stock_values.nearest, "E12", 5000, 4700),
    (stock_values.at_least, "E6", 3400, 4700),
    (stock_values.at_least, "E12", 2300, 2700),
    (stock_values.nearest, "E24", 319, 330),
    (stock_values.at_least, "E6", 68.1, 100),
    (stock_values.at_most, "E24", 99, 91),
    (stock_values.nearest, "E12", 0.0047, 0.0047),
    (stock_values.at_least, "E12", 1e-3, 1e-3),
])
def test_choice(choose, series: str, value: float, expected: float) -> None:  # type: ignore[no-untyped-def]
    """First four: output of eseries 1.2.1; the others by looking at the table."""
    assert choose(series, value) == expected


@pytest.mark.parametrize("name", SERIES)
def test_choices_agree_with_the_package(name: str) -> None:
    for k in range(1, 400):
        value = 1.7e-6 * 1.11 ** k
        if value > 1e9:
            break
        assert stock_values.nearest(name, value) == pytest.approx(eseries.find_nearest(SERIES[name], value))
        assert stock_values.at_least(name, value) == pytest.approx(
            eseries.find_greater_than_or_equal(SERIES[name], value))
        assert stock_values.at_most(name, value) == pytest.approx(
            eseries.find_less_than_or_equal(SERIES[name], value))


def test_about_fifty_ohms_from_stock() -> None:
    """Common practice, no source: 47 or 56 of E12; two 100 in parallel are 50, four 220 in parallel 55."""
    assert stock_values.nearest("E12", 50) == 47
    assert stock_values.at_least("E12", 50) == 56
    assert stock_values.nearest("E12", 2 * 50) == 100
    assert stock_values.nearest("E12", 4 * 55) == 220


@pytest.mark.parametrize(("series", "value"), [("E7", 10.0), ("E12", 0.0), ("E12", -5.0), ("E12", float("nan")),
                                               ("E12", float("inf"))])
def test_refusals(series: str, value: float) -> None:
    with pytest.raises(stock_values.StockValueError):
        stock_values.nearest(series, value)  # type: ignore[arg-type]
