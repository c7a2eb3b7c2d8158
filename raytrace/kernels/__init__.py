"""Compiled kernels of the light paths: floats and arrays in G = c = M = 1 in, numbers and integer statuses out."""
