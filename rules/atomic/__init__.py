"""The atoms of a set: their energies, and the number that explains why one is not stationary."""
