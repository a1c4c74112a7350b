"""Joint draws and limit states to failure probabilities and indices."""
