"""A record in open formats for other programs."""
