"""One day of one cell: sun, courses, canopy and what heat and photorespiration took."""
