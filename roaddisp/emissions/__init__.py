"""From vehicles to line strengths of NOx and primary NO2."""
