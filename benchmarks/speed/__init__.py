"""How fast the program itself is."""
