"""Layer 3: random draws of uncertain values, keyed by name."""
