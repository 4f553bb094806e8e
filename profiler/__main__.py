"""Run hopwright as ``python -m profiler``."""

from profiler.cli import main

if __name__ == "__main__":
    main()
