"""Statistics for comparing several groups: arrays in, frozen results out."""
