"""Rolling-ball engine: document, geometry, contact, dynamics, findings, parts."""
