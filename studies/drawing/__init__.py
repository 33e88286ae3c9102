"""Drawings of one design: outlines as numbers, cross-section and winding as SVG."""
