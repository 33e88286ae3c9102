"""The machine itself: winding, geometry, materials, losses, mechanics, cost, and the metrics they yield."""
