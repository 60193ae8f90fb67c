"""Case files: TOML into frozen, checked tables."""
