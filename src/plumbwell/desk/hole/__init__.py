"""The hole itself: core strip and fan."""
