"""Roads as lines with a width, receptors as points."""
