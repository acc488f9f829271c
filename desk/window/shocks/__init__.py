"""The station Shocks."""
