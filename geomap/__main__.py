"""Run geomap as ``python -m geomap``."""

from geomap.cli import main

if __name__ == "__main__":
    main()
