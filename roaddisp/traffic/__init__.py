"""From counts to vehicles on each link in each hour."""
