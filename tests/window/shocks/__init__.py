"""Tests of the station Shocks."""
