"""Field numerics: arrays in, arrays out. No Qt, no files, no session."""
