"""Results as text for people: one report a file, each a function from result objects to a string."""
