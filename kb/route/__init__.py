"""A sequence of steps and the material it needs."""
