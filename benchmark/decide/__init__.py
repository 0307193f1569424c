"""Policies, requirements, verdict (layer 7)."""
