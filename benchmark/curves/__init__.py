"""Raw measured tables (layer 8): a file from an instrument or a figure, read as its description says."""
