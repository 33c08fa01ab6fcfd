"""A timetable becomes stations, links, lines and corridors."""
