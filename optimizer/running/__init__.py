"""One run: ask, evaluate, store, tell."""
