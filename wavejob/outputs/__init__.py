"""What a run leaves behind: tables, fields, film, overview, manifest, log, and the folder that keeps them."""
