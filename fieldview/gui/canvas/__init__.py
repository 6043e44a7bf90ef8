"""The canvas: the field, the regions over it, and the pointer's way between pixels and the plane."""
