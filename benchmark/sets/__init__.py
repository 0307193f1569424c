"""Files to sets (layer 2): read, validate with every problem in one pass, convert to SI with provenance."""
