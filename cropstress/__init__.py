"""cropstress: what heat and photorespiration cost a crop, cell by cell."""
