"""The interim road: decide by interim payments and interim probabilities alone."""
