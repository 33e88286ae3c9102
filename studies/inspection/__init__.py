"""One stored design in full."""
