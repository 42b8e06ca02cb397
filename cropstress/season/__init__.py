"""One season of one cell: stages, counts and sums."""
