"""Type graphs: payments of a settled decision rule under dominant honesty, as shortest paths."""
