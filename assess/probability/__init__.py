"""Marginals, dependence, standard normal space; knows nothing of structures."""
