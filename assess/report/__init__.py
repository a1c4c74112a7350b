"""Figures, the document tree and its writers."""
