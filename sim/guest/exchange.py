"""The places of the numbers that a virtual board and its world exchange between two ticks.

Both sides hold the same array of 32-bit integers: in the first half the world tells how things are, in the second the
board tells what it wants. Nothing else crosses, so one world serves control on CPython and on real MicroPython alike.
"""

# World to board.
TICKS_US = 0
TICKS_MS = 1
INPUTS = 2  # two words
RX_COUNT = 4
TX_ROOM = 5
BANKS_IN = 6
BANK_IN_WORDS = 5
LOW_MV, MEAN_MV, LAST_MV, AGE_US, RUNNING = 0, 1, 2, 3, 4

# Board to world. The world sets these to 0 when it has taken them (but leaves DUE_US, FOLLOWERS and CHARGE).
DUE_US = 24
TX_COUNT = 25
FOLLOWERS = 26  # two words
CHARGE = 28  # bit n: the charge path of bank n is off
RESET = 29
FED = 30
HEAP_USED = 31
# How many of the bytes that were given have been read.
RX_TAKEN = 41
# Settings were put in force; steps of flash writing; whether lines were written in between.
CONFIGURED = 42
FLASHED = 43
WROTE = 44
BANKS_OUT = 32
BANK_OUT_WORDS = 3
GROUP, MASK, WIDTH_US = 0, 1, 2

WORDS = 48
BANKS = 3
RX_BYTES = 512
TX_BYTES = 1024
