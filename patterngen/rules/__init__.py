"""Rules: one a file, named for the defect it finds or the value it derives; limits by process as data."""
