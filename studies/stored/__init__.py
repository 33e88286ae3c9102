"""What lies in a results folder, and getting it back."""
