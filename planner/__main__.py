"""``python -m planner`` is the command ``planner``."""

from planner.cli import run

if __name__ == "__main__":
    run()
