"""Reading GTFS Schedule: a path becomes the timetable of one service date."""
