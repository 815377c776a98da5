"""The browser app: ``streamlit run streamlit_app.py``."""

from planner.app.main import main

main()
