"""Potentials: one class per kind."""
