"""Many runs: all through overrides and `run`."""
