"""What the script on verdicts is made of: dies whose true zero is known, what was said of them, tables."""
