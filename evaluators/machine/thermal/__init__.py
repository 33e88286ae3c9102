"""Heat: conduction, convection, the lumped network of the machine, and insulation classes."""
