"""Wire and inverter."""
