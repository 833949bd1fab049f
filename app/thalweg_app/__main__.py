"""`python -m thalweg_app` and the command `thalweg`."""

from __future__ import annotations

import sys

from thalweg_app.cli import main as run_command_line


def main() -> None:
    sys.exit(run_command_line())


if __name__ == "__main__":
    main()
