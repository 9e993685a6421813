"""One published eye model a file, author and year in its name."""
