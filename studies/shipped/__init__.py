"""The studies that come with the package."""
