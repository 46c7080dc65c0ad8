"""Reference cases: independent solutions that the engine is held against."""
