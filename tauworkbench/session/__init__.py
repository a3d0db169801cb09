"""Choices, the table of stages, files: one run end to end."""
