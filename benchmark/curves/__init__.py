"""Raw measured tables (layer 7.5): a file from an instrument or a figure, read as its description says."""
