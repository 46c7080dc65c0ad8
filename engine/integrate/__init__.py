"""Time stepping: one step, events, the loop, the trajectory."""
