"""Strength, bending and balance of the rotor."""
