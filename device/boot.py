"""Every pin that may drive a coil: low, before anything else. Runs after every reset, soft ones too."""

from machine import Pin

for pin in list(range(23)) + [26, 27, 28]:
    Pin(pin, Pin.OUT, value=0)
