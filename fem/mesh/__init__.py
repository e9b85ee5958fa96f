"""The plan to triangles, and to finer triangles."""
