"""Questions asked of a study beyond one run."""
