"""The host side: link to a board, model of what it says, sessions, command line and terminal."""
