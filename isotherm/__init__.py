"""A pressure-area trace becomes numbers, each with its uncertainty."""
