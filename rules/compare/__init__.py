"""Two blocks compared: equal in which sense, contained, or different and where; digests."""
