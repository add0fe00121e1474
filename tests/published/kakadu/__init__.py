"""The open contingent-valuation survey Kakadu, from answers to verdict."""
