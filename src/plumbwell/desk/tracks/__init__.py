"""Depth tracks: values against depth, side by side under one depth axis."""
