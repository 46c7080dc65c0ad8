"""The window on a design: lay out, roll, understand."""
