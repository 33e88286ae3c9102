"""From solved fields to quantities of a machine."""
