"""Losses of the machine: iron, copper, and eddy currents in magnets and sleeve."""
