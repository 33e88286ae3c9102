"""The study file and what a user does with it."""
