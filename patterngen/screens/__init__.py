"""One file a kind of screen."""
