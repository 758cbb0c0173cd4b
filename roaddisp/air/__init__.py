"""The air before the roads of the study."""
