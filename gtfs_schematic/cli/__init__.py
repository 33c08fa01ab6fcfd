"""Words from the command line become calls."""
