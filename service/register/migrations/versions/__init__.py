"""How the register's tables came to be, one step after the other."""
