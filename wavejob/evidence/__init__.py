"""Evidence: further runs of the same job, and what they say about its figures."""
