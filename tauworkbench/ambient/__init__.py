"""Recovery of the ambient behind a lagged reading, with a band; a filter for firmware."""
