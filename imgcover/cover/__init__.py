"""How much of the field is yarn: the light that comes through, from backlit pictures."""
