"""How the part leaves the steel: faces against the pull, silhouettes, trapped volume, draft, choice of the pull."""
