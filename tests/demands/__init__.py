"""Tests of what is asked."""
