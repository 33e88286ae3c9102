"""The mesh of one slot pitch, repeated over a sector."""
