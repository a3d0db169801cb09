"""From a step in a trace to time constants with intervals."""
