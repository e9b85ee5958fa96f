"""What regions are made of, and the library that comes with the program."""

from fem.stock.models import Stock, find, library, nearest

__all__ = ["Stock", "find", "library", "nearest"]
