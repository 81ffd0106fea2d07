"""What was measured, as frozen values with their checks. Nothing is computed here."""
