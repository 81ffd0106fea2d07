"""One survey worked through: the chain, its results, every output column, the docket, acts and history."""
