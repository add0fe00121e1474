"""Tests of weighing."""
