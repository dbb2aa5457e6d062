"""Renderers of reports and of what the graph knows; they read records and write text."""
