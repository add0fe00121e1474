"""Tests of the engine adapters, and programs to test with."""
