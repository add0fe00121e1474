"""Attacks on the checker: true proofs spoiled in thousands of ways."""
