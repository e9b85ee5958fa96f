"""Sections of the scenarios solved by an independent general-purpose library, from the same files and by another road."""
