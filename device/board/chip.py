"""Register addresses of the two chips, as their datasheets list them (from memory, checked on an emulated RP2040).

Addresses from 2**30 up are kept in attributes: a constant in a loop would be made anew each time.
"""

SIO_GPIO_IN = 0xD000_0004
PIO0 = 0x5020_0000
PIO_SM_ADDRESS = 0x0D4
PIO_SM_STRIDE = 0x18
DMA = 0x5000_0000
DMA_STRIDE = 0x40
DMA_WRITE_ADDRESS = 0x04
DMA_CONTROL = 0x0C
DMA_BUSY = 1 << 24
# Writing to this much above a register clears the bits that are written.
CLEAR_ALIAS = 0x3000

# Of the ADC's registers.
CS, FCS, FIFO, DIV = 0x00, 0x08, 0x0C, 0x10
CS_ENABLE, CS_MANY, CS_READY = 1 << 0, 1 << 3, 1 << 8
CS_ROUND_SHIFT = 16
FCS_ENABLE, FCS_DREQ, FCS_EMPTY, FCS_OVER = 1 << 0, 1 << 3, 1 << 8, 1 << 11
FCS_ONE = 1 << 24

# Of the watchdog's: control, and memory that outlives its resets.
WATCHDOG_ENABLE = 1 << 30
WATCHDOG_SCRATCH = 0x0C


class Chip:
    """What differs. `name` is 'rp2040' or 'rp2350'."""

    def __init__(self, machine_name: str) -> None:
        if "RP2350" in machine_name:
            self.name = "rp2350"
            self.adc = 0x400A_0000
            self.watchdog = 0x400D_8000
            self.dreq_adc = 48
            # POWMAN CHIP_RESET: which kind of reset came last.
            self.reset_register = 0x4010_002C
            self.power_bit = 1 << 16
            self.brown_out_bit = 1 << 17
        else:
            self.name = "rp2040"
            self.adc = 0x4004_C000
            self.watchdog = 0x4005_8000
            self.dreq_adc = 36
            # VREG_AND_CHIP_RESET CHIP_RESET: power and brown-out are one bit here.
            self.reset_register = 0x4006_4008
            self.power_bit = 1 << 8
            self.brown_out_bit = 0
