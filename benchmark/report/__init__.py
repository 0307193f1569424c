"""Tables, charts, page and record folder (layer 9): made from the record alone."""
