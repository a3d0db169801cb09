"""Thermal models: transfer functions, what drives them, and how they answer. No data, no fitter."""
