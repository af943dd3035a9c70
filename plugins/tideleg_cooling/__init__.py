"""Cooling models: each describes a thermal network from its own keys."""
