"""The machine itself: winding, geometry, materials, losses, strength, heat, levitation, cost.

`performance` turns a field solution into the metrics that `metrics` registers.
"""
