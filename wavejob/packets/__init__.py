"""Packets: the initial state, one class per kind."""
