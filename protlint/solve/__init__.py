"""Solving: what a limiter and its surroundings really do."""
