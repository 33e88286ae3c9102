"""The study file: read, checked completely, and turned into the objects the other rooms use."""
