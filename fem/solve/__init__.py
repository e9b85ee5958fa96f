"""The discrete conduction problem, its march through time and its steady state."""
