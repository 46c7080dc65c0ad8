"""Curves, frames and meridians as tables of numbers."""
