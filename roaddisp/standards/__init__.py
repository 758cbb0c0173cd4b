"""What each air-quality standard asks, and whether it is met."""
