"""One file for each command of ``hovergap``."""
