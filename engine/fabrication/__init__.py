"""Parts: wall solids, their inspection, their files."""
