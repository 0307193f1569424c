"""Run the command line with ``python -m benchmark``."""

from benchmark.cli import main

if __name__ == "__main__":
    main()
