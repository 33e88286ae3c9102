"""What is to be built: everything the search does not vary."""
