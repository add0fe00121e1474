"""The classic closed-form rules, one file each, built exactly and held to the same audit."""
