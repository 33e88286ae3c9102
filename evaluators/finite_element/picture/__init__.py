"""The field of one design, ready to be drawn."""
