"""Holds any payment table against every demand, straight from the definitions."""
