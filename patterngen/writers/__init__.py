"""What leaves the program: SVG, PDF, verdict, manifest."""
