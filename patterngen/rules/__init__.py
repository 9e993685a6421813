"""One rule a file, named for the defect; limits by process in data files with a source for each number."""
