"""Studies: runs on three meshes and three step sequences, and the figures read from them."""
