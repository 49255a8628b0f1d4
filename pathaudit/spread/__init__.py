"""What a path comes to when the cell is not exactly as stated: chances, bands, sensitivities, and how far off it may be."""
