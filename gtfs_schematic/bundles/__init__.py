"""A layout gets its parallel lines ordered and offset."""
