"""The march in time, which knows nothing of heat, files or probes."""
