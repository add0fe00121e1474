"""Independent ways of computing the same answers."""
