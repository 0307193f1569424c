"""Running a study and its record (layer 8): everything right of the record is made from it alone."""
