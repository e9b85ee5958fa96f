"""Values over time, and the laws that they become."""
