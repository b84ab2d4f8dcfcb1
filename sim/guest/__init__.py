"""The virtual board's half that runs beside the firmware, on CPython or inside real MicroPython."""
