"""The parts of the report, each a function from a run record to document nodes."""
