"""What goes wrong in a run, where, by how much and what cures it."""
