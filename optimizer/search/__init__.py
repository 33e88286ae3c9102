"""Decomposition-based evolutionary search: one generation is one batch."""

from optimizer.search.decomposition import DecompositionSearch, SearchState

__all__ = ["DecompositionSearch", "SearchState"]
