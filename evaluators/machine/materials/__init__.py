"""Materials with their sources, and the gas round the rotor."""
