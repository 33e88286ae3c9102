"""Families held against each other."""
