"""Numbers against those of the neighbours in the row, and what the set shows of its norms."""
