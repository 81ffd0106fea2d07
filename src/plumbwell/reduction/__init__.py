"""From readings to gravity at the stations, freed of everything that is known."""
