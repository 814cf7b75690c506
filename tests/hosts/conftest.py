"""Makes the helpers in this folder importable for the tests below it."""
