"""Pure functions of a verdict, an audit or a finding: screens for people, documents for programs."""
