"""How a bank charges and discharges, in whole numbers below 2**30: the laws of the RC circuit (definition).

Charge: v(t) = full - (full - v0) exp(-t / RC). Discharge into a coil: v(t) = rest + (v0 - rest) exp(-t / R'C), where
`rest` is what a coil held on would leave. Used for estimates and expected drops, never for the decision to fire.
"""

from shared_protocol import settings_table as table
from shared_protocol.settings import BankSettings
from shared_protocol.settings_check import charge_time_constant_ms

# exp(-x) in 4096ths for x = 0, 1/4, 2/4 ... 8.
_EXP_4096 = (
    4096, 3190, 2484, 1935, 1507, 1174, 914, 712, 554, 432, 336, 262, 204, 159, 124, 96, 75,
    58, 46, 35, 28, 21, 17, 13, 10, 8, 6, 5, 4, 3, 2, 2, 1,
)  # fmt: skip
# ln(1 + k/16) in 256ths, k = 0 to 16.
_LN_256 = (0, 16, 30, 44, 57, 70, 82, 93, 104, 114, 124, 134, 143, 152, 161, 169, 177)
_LN2_256 = 177

NEVER = -1
LONGEST_ESTIMATE_MS = 3_600_000


def exp_4096(x_256: int) -> int:
    """4096 exp(-x / 256), for x from 0; linear between quarter steps (within 0.8 % of 4096)."""
    place = x_256 >> 6
    if place >= 32:
        return 0
    here = _EXP_4096[place]
    return here - (((here - _EXP_4096[place + 1]) * (x_256 & 63)) >> 6)


def ln_256(ratio_256: int) -> int:
    """256 ln(ratio / 256), for ratio of at least 256."""
    halvings = 0
    while ratio_256 >= 512:
        ratio_256 >>= 1
        halvings += 1
    over = ratio_256 - 256
    place = over >> 4
    here = _LN_256[place]
    return halvings * _LN2_256 + here + (((_LN_256[place + 1] - here) * (over & 15)) >> 4)


def ms_until(bank: BankSettings, now_mv: int, wanted_mv: int) -> int:
    """Milliseconds until the bank, now at `now_mv`, holds `wanted_mv`; NEVER if it can't."""
    if now_mv >= wanted_mv:
        return 0
    full_mv = bank.full_mv
    if wanted_mv >= full_mv:
        return NEVER
    charge = bank.charge
    ratio = ((full_mv - now_mv) << 8) // (full_mv - wanted_mv)
    wait_ms = (charge_time_constant_ms(charge) * ln_256(ratio)) >> 8
    if charge.kind == table.LIMITED and charge.limit_ma:
        # C dV / I; the difference in 10 mV keeps the product small.
        steady_ms = charge.cap_uf * ((wanted_mv - now_mv) // 10 + 1) // charge.limit_ma // 100
        if steady_ms > wait_ms:
            wait_ms = steady_ms
    return wait_ms + 1 if wait_ms < LONGEST_ESTIMATE_MS else LONGEST_ESTIMATE_MS


def charged_mv(bank: BankSettings, from_mv: int, ms: int) -> int:
    """What the bank should hold `ms` after it held `from_mv`."""
    if from_mv >= bank.full_mv:
        return bank.full_mv
    tau_ms = charge_time_constant_ms(bank.charge)
    if ms >= tau_ms << 3:
        return bank.full_mv
    missing = bank.full_mv - from_mv
    gained = missing - ((missing * exp_4096((ms << 8) // tau_ms)) >> 12)
    limit_ma = bank.charge.limit_ma
    if bank.charge.kind == table.LIMITED and limit_ma:
        steady = limit_ma * min(ms, 60_000) // bank.charge.cap_uf * 1000
        if steady < gained:
            gained = steady
    return from_mv + gained


def drop_mv(bank: BankSettings, coil_cohm: int, from_mv: int, width_us: int) -> int:
    """By how much a pulse of `width_us` into `coil_cohm` should lower the bank. The coil's inductance is left out."""
    tau_us = coil_cohm * bank.charge.cap_uf // 100
    left = exp_4096((width_us << 8) // tau_us if tau_us else 2048)
    held_mv = bank.full_mv * coil_cohm // (coil_cohm + bank.charge.charge_dohm * 10)
    if bank.charge.kind == table.LIMITED and bank.charge.limit_ma:
        # A limited source can hold no more on the coil than its current makes there.
        held_mv = min(held_mv, bank.charge.limit_ma * coil_cohm // 100)
    if from_mv <= held_mv:
        return 0
    return ((from_mv - held_mv) * (4096 - left)) >> 12
