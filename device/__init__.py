"""The firmware: pure logic in control, one thin hardware layer in board."""
