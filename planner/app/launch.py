"""Starting the app: on this computer only, silent towards every other."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

from planner.errors import MissingPartError, ProjectError

FOLDER_VARIABLE = "PLANNER_FOLDER"
"""Environment variable that tells the app which folder to open."""

UPLOAD_MB = 400
"""Largest upload: half an hour of stereo at 48 kHz, 24 bit. [MB]"""

THEME = {
    "theme.base": "light",
    "theme.primaryColor": "#5559a4",
    "theme.light.backgroundColor": "#ffffff",
    "theme.light.secondaryBackgroundColor": "#f3f4f8",
    "theme.light.textColor": "#1c1d26",
    "theme.dark.backgroundColor": "#0e1117",
    "theme.dark.secondaryBackgroundColor": "#1b1f2a",
    "theme.dark.primaryColor": "#9da1e0",
}


def flags(port: int, *, browser: bool, lan: bool) -> dict[str, str]:
    """Settings of the server: address, no statistics, no file watching, own colours."""
    return {
        "server.address": "0.0.0.0" if lan else "127.0.0.1",
        "server.port": str(port),
        "server.headless": "false" if browser else "true",
        "server.fileWatcherType": "none",
        "server.showEmailPrompt": "false",
        "runner.magicEnabled": "false",
        "server.maxUploadSize": str(UPLOAD_MB),
        "browser.serverAddress": "localhost",
        "browser.gatherUsageStats": "false",
        "client.toolbarMode": "minimal",
        "client.showErrorDetails": "none",
        **{key: value for key, value in THEME.items() if key != "theme.base"},
    }


def launch(
    folder: Path | None, *, port: int = 8501, browser: bool = True, lan: bool = False
) -> int:
    """Run the app until it is stopped.

    Parameters
    ----------
    folder
        Project to open; None begins with an empty sketch.
    port
        On this computer.
    browser
        Open a browser window.
    lan
        Listen to the whole network; whoever is in it can then open the app.

    Returns
    -------
    code
        Exit code of the server.

    Raises
    ------
    ProjectError
        The folder does not exist.
    MissingPartError
        Streamlit is not installed.
    """
    if folder is not None and not folder.is_dir():
        raise ProjectError(
            "is no folder", file=folder, cure="Name a project folder, or none to begin anew."
        )
    try:
        import streamlit  # noqa: F401 - only to say kindly that it is missing
    except ImportError as error:
        raise MissingPartError(
            "streamlit is not installed: the browser app needs it. "
            "Install it with: pip install streamlit"
        ) from error
    if lan:
        sys.stderr.write(
            "Warning: every computer in this network can open the app and its files. There is no "
            "password. Stop it with Ctrl+C when you are done.\n"
        )
    environment = {**os.environ, "STREAMLIT_BROWSER_GATHER_USAGE_STATS": "false"}
    if folder is not None:
        environment[FOLDER_VARIABLE] = str(folder.resolve())
    command = [sys.executable, "-m", "streamlit", "run", str(Path(__file__).with_name("start.py"))]
    for name, value in flags(port, browser=browser, lan=lan).items():
        command += [f"--{name}", value]
    try:
        return subprocess.call(command, env=environment)
    except KeyboardInterrupt:
        return 0
