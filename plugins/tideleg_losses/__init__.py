"""Loss models: each reads one kind of part, states its formula and source, and asks for its own data."""
