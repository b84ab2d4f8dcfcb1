"""The integer laws of the bank against their definitions (RC circuit), and that no intermediate leaves 2**30."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from device.control import recharge
from shared_protocol.settings import BankSettings, ChargeSettings


def bank(
    cap_uf: int = 4700, charge_dohm: int = 470, full_mv: int = 16_000, kind: int = 0, limit_ma: int = 0
) -> BankSettings:
    made = BankSettings()
    made.full_mv = full_mv
    made.charge = ChargeSettings()
    made.charge.cap_uf = cap_uf
    made.charge.charge_dohm = charge_dohm
    made.charge.kind = kind
    made.charge.limit_ma = limit_ma
    return made


@given(st.integers(0, 2048))
def test_exp(x_256: int) -> None:
    assert abs(recharge.exp_4096(x_256) / 4096 - math.exp(-x_256 / 256)) < 0.008


@given(st.integers(256, 33_000 * 256))
def test_ln(ratio_256: int) -> None:
    assert abs(recharge.ln_256(ratio_256) / 256 - math.log(ratio_256 / 256)) < 0.035


# Charge after 1 to 3 time constants: 63.2121, 86.4665, 95.0213 % (definition of the RC circuit).
@pytest.mark.parametrize(("constants", "percent"), [(1, 63.2121), (2, 86.4665), (3, 95.0213)])
def test_charge_after_time_constants(constants: int, percent: float) -> None:
    tau_ms = 4700 * 470 // 10_000
    held = recharge.charged_mv(bank(), 0, constants * tau_ms) / 16_000 * 100
    assert held == pytest.approx(percent, abs=1.0)


# Time to 90, 95 and 99 %: 2.302585, 2.995732, 4.605170 time constants (definition).
@pytest.mark.parametrize(("percent", "constants"), [(90, 2.302585), (95, 2.995732), (99, 4.605170)])
def test_time_until(percent: int, constants: float) -> None:
    wait_ms = recharge.ms_until(bank(), 0, 160 * percent)
    assert wait_ms == pytest.approx(constants * 220.9, rel=0.03)


def test_what_can_never_be_reached_says_so() -> None:
    assert recharge.ms_until(bank(), 0, 16_000) == recharge.NEVER
    assert recharge.ms_until(bank(), 12_000, 11_000) == 0


def test_a_limited_source_charges_in_a_straight_line() -> None:
    # C dV / I: 4700 uF by 10 V at 500 mA take 94 ms.
    slow = bank(charge_dohm=10, kind=2, limit_ma=500)
    assert recharge.ms_until(slow, 2000, 12_000) == pytest.approx(94, abs=2)


SMALL = 1 << 30


class Watched(int):
    """A whole number that refuses to grow beyond what a board holds without allocating."""

    def _checked(self, value: int) -> "Watched":
        assert -SMALL <= value < SMALL, value
        return Watched(value)

    def __add__(self, other: int) -> "Watched":
        return self._checked(int(self) + int(other))

    __radd__ = __add__

    def __sub__(self, other: int) -> "Watched":
        return self._checked(int(self) - int(other))

    def __rsub__(self, other: int) -> "Watched":
        return self._checked(int(other) - int(self))

    def __mul__(self, other: int) -> "Watched":
        return self._checked(int(self) * int(other))

    __rmul__ = __mul__

    def __floordiv__(self, other: int) -> "Watched":
        return self._checked(int(self) // int(other))

    def __rfloordiv__(self, other: int) -> "Watched":
        return self._checked(int(other) // int(self))

    def __lshift__(self, other: int) -> "Watched":
        return self._checked(int(self) << int(other))


@given(
    st.integers(100, 47_000), st.integers(1, 10_000), st.integers(3000, 33_000),
    st.sampled_from([(0, 0), (2, 1), (2, 5000)]),
    st.integers(0, 40_000), st.integers(1000, 33_000), st.integers(25, 4000), st.integers(3000, 65_000),
    st.integers(0, 3_600_000),
)  # fmt: skip
def test_every_intermediate_is_small(
    cap_uf: int, charge_dohm: int, full_mv: int, source: tuple[int, int], now_mv: int, wanted_mv: int, cohm: int,
    width_us: int, ms: int,
) -> None:  # fmt: skip
    made = bank(Watched(cap_uf), Watched(charge_dohm), Watched(full_mv), source[0], Watched(source[1]))
    recharge.ms_until(made, Watched(now_mv), Watched(wanted_mv))
    recharge.charged_mv(made, Watched(now_mv), Watched(ms))
    drop = recharge.drop_mv(made, Watched(cohm), Watched(now_mv), Watched(width_us))
    assert 0 <= drop <= max(now_mv, 0)
