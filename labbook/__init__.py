"""labbook: a group's bench notebook for artificial swimmers and its registry of dimensionless numbers."""
