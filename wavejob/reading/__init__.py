"""Text in: documents that keep line and column, quantities with units, safe formulas."""
