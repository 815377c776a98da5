"""What the server runs on each change: see `planner.app.main`."""

from planner.app.main import main

main()
