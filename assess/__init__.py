"""Reliability assessment of ageing reinforced-concrete structures."""
