"""What the engineer said: case file, units, survey tables and their checks."""
