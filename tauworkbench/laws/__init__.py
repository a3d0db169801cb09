"""Resistance and temperature, both ways, with the slope."""
