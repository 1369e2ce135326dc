"""The checker's findings."""
