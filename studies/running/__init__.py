"""Searching the families of a study, and watching it."""
