"""Everything drawn, on screen or on paper."""
