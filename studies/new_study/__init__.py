"""A first study for a machine that is only known by power, speed and DC link."""
