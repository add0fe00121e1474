"""The benchmarks measure what they say they measure."""
