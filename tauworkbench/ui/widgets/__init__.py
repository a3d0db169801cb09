"""The page itself: the only ipywidgets of the package."""
