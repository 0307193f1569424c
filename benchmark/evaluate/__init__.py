"""Sets x knobs x draws -> operation metrics (layer 6): the same steps for every technology."""
