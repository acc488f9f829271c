"""Drawn paths of rates and the savings account, and what flows are worth along them."""
