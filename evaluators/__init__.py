"""Models of bearingless permanent-magnet machines behind one evaluator interface; knows nothing of searching."""
