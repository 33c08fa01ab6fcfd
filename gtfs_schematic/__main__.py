"""Run the command line as ``python -m gtfs_schematic``."""

from __future__ import annotations

from gtfs_schematic.cli.main import main

if __name__ == "__main__":
    main()
