"""Many jobs at once: which is next, processes that carry them out, and how far the whole is."""
