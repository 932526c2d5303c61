"""Rule tables, compiled rule sets and exposure limits. Pure: numpy and the standard library."""
