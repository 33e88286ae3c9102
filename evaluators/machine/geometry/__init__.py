"""Design variables, cross-sections and their outlines."""
