"""Compiled kernels of the job itself: sampling images along circles and sharing light among pixels."""
