"""Text of a switch as a sub-circuit of a circuit simulator, one module per kind of current law (layer 4)."""
