"""`python -m cutblock` is the command line."""

from cutblock.cli.main import main

if __name__ == "__main__":
    raise SystemExit(main())
