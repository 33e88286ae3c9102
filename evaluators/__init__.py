"""Models of bearingless permanent-magnet machines behind one interface; knows no searching."""
