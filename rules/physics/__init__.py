"""The formulas that rules rest on; nothing here knows of findings."""
