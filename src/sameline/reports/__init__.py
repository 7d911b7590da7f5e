"""Results as people and programs read them: terminal text, data frames, JSON."""
