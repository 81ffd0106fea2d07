"""What each stage shows: its ledger, its plots, its figure of merit."""
