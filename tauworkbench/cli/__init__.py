"""The command line: arguments to choices, choices to a summary."""
