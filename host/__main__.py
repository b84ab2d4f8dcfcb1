"""Entry point of the command line."""

import sys


def main() -> None:
    """Run the command line and leave with its exit status."""
    from host.cli import main as run

    sys.exit(run(sys.argv[1:]))


if __name__ == "__main__":
    main()
