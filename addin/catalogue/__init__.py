"""The catalogue: one row for each worksheet function, and all that follows from it.

``registry.py`` assembles the families into ``CATALOGUE``; ``types.py`` says what a
row is. Nothing is imported here, so that a table reader may use the row types
while the registry, which needs the readers, is still being assembled.
"""
