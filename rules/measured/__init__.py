"""What is measured of a set in real geometries, who is to blame, and how it is told."""
