"""Numbers only: arrays in, frozen result objects out."""
