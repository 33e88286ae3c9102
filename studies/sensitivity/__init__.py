"""How strongly a design's metrics follow from each variable, near the design and over the box."""
