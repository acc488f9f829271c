"""The station Scenarios."""
