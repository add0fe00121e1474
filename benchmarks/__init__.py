"""Sized problems, our time on them and other ways' time on them, in one run."""
