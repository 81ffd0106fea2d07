"""Plots against time: readings and drift, a panel a run."""
