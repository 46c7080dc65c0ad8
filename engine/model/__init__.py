"""The document: what a designer has drawn, frozen and validated."""
