"""What the scripts that measure accuracy share: the true response and its bound, scenarios, methods, tables."""
