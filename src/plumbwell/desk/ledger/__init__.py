"""The ledger: a real table of the present stage, sorted, filtered, chosen from and copied."""
