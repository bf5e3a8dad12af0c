"""`python -m coverage_lab` is `coverage-lab`."""

from coverage_lab.cli import main

if __name__ == "__main__":
    main()
