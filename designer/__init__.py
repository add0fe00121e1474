"""designer: payment rules for shared decisions, proved before anyone signs."""
