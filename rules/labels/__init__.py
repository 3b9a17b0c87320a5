"""Labels and compositions: what a set is claimed to be, what it holds, and which label fits."""
