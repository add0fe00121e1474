"""The classic rules, held against what their sources say."""
