"""Workbook files: the package, its sheet parts, and values stored without touching anything else."""
