"""The station Curve."""
