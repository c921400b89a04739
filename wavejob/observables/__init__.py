"""Observables: what is measured while a packet travels, one class per kind."""
