"""The version of the program and of its numerics: this is their only home."""

__version__ = "0.1.0"

# Raised whenever the same job would give other numbers; it is part of every fingerprint.
NUMERICS = 1
