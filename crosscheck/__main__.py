"""`python -m crosscheck` is the `crosscheck` command."""

from crosscheck.cli import main

if __name__ == "__main__":
    raise SystemExit(main())
