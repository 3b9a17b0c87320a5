"""What families of basis sets contain: data with their sources, and the formulas that use them."""
