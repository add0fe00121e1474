"""Reading scenarios: keys, mistakes, sheets, the value language, laws and attacks."""
