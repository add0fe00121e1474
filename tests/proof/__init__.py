"""Proofs: how they are found, written down and checked."""
