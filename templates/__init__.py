"""Templates of the sheet and its style, and the starter cases, as package data."""
