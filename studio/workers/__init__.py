"""Work beside the event loop."""
