"""The window: what was surveyed, seen and judged, with everything live."""
