"""The drawings: plan, elevation, solid view, inspector, findings."""
