"""Files for others: drawings, windings, materials, fronts, and data for solver and controller."""
