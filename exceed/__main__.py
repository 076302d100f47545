"""`python -m exceed`."""

from __future__ import annotations

from exceed.cli.app import main

if __name__ == "__main__":
    main()
