"""The gates of the engine, listed by hand in id order."""
