"""Finding limiters: the rule language and the matcher."""
