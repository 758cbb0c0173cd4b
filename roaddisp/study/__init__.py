"""What the user brings: read, checked, brought to SI."""
