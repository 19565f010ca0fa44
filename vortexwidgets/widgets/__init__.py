"""How a person turns it."""
