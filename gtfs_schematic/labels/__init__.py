"""A bundled layout gets its station names."""
