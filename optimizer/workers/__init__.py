"""Evaluating chunks of designs, here or in worker processes that may die."""
