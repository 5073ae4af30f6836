"""`python -m sweepmill` is the same as `sweepmill`."""

from sweepmill.cli import main

if __name__ == "__main__":
    main()
