"""The roads: each against the plain program, by exact value."""
