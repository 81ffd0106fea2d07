"""From gravity to rock: interval densities, layers, logs, porosity, overburden."""
