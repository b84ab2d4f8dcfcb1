"""The firmware's way onto a board."""
