"""A network becomes an octilinear layout on a sheet."""
