"""The program of the state machine that times a bank's pulses, one word a pulse.

A word holds the width (16 bits, microseconds less 2) and the mask above it. At 1 MHz a width of n keeps the pins on for
n + 2 microseconds. Then it counts the gap (y holds its length), and throws away every word that arrives until that is
over. The names below are the assembler's: they exist only while `rp2.asm_pio` runs `program`.
"""

# ruff: noqa: F821
# mypy: disable-error-code="name-defined, no-untyped-def"

FREQUENCY_HZ = 1_000_000
# What the program adds to the width that it is given, and the shortest pulse that it can make.
EXTRA_US = 2
SHORTEST_US = 3
LONGEST_US = 65_535
# Microseconds of the gap a count of y takes, and words of the program.
GAP_STEP_US = 2
WORDS = 8
MASK_SHIFT = 16


def assemble(rp2, coils: int):
    """The program for a bank of `coils` (1 to 13) pins that follow each other, assembled by the module `rp2`."""

    # A default value, not a closure: the assembler needs a plain function.
    def program(coils=coils):
        pull(block)
        out(x, 16)
        out(pins, coils)
        label("on")
        jmp(x_dec, "on")
        mov(pins, null)
        mov(x, y)
        label("gap")
        pull(noblock)
        jmp(x_dec, "gap")

    pio = rp2.PIO
    return rp2.asm_pio(out_init=(pio.OUT_LOW,) * coils, out_shiftdir=pio.SHIFT_RIGHT)(program)
