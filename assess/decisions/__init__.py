"""Targets, verdicts and options."""
