"""Transit network diagrams from GTFS feeds."""
