"""Choosing one design from everything evaluated: preferences in, a ranking and its reasons out."""
