"""The station Intake."""
