"""The run folder and everything that works from it alone."""
