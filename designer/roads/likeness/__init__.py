"""The likeness road: profiles up to trading places between parties that are alike."""
