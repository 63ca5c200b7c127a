"""A dipping log becomes a verdict, stroke by stroke."""
