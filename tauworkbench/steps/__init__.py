"""Bracket the steps in a trace; the onset itself, with its interval, is the estimate's."""
