"""The docket: one function a kind of finding."""
