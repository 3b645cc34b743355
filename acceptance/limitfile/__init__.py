"""Limits and bench files: YAML to a checked, plain description of what must be met and what measured it."""
