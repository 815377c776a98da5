"""The browser pages: thin over the package. Enters what a person types or drops, leaves pages.

One project model lives in the session (`planner.app.work`); a page asks, calls and shows.
"""
