"""Everything on disk: survey folders, logs, grids, tables written, dossiers."""
