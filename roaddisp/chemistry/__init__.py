"""From NOx to NO2."""
