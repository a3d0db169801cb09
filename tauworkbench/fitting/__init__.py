"""Least squares, projection and profiles: the only lmfit, and no physics."""
