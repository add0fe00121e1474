"""Saving and reading files."""
