"""How values and words from files look to people, in every medium."""
