"""Every evaluation on disk."""
