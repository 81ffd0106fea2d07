"""The tray under ledger and plots: its pages, and the line that asks for a reason."""
