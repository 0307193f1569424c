"""Numbers read off measured curves, with their uncertainty (layer 3): nothing is smoothed, nothing extrapolated."""
