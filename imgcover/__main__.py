"""`python -m imgcover` is `imgcover`."""

from __future__ import annotations

from imgcover.cli import run

if __name__ == "__main__":
    run()
