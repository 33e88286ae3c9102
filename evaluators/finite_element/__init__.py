"""Finite-element evaluator: the nonlinear 2-D field over the turn, from first principles."""
