"""Tests; the folders mirror the package, beside published facts, oracles and attacks."""
