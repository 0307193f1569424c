"""Circuits (layer 5): cells as switch topologies, stages, operations; the same code for every technology."""
