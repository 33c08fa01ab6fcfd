"""Looking at an edition on a local web page."""
