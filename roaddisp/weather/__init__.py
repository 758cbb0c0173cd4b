"""From a station's hours to the wind, stability and lid the plume meets."""
