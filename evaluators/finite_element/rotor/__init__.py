"""The rotor as seen from the bore."""
