"""Pure functions of a verdict, an audit, a finding: screens for people, documents for programs."""
