"""Prior and evidence to a PyMC model to joint draws."""
