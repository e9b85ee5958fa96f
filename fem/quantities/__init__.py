"""Physical quantities: kinds, spellings and the only conversions of units."""
