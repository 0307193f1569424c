"""Pure array functions in SI (layer 3): no files, no state; units in brackets in every docstring."""
