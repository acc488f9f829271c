"""Day counts, compounding, curves and short-rate models."""
