"""Which superpositions of screens are coarse enough to matter, and how strong they are."""
