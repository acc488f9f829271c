"""The station Standing."""
