"""From samples to steady points: dwells, means, what the instruments add, propagation."""
