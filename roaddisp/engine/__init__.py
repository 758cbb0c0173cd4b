"""The one place concentrations come from."""
