"""What the planet does: gravity, its change with height, rock shells, tides, the weight of the air."""
