"""The firmware on a board: putting it there, its self-test, its text. Works through MicroPython's prompt (mpremote)."""
