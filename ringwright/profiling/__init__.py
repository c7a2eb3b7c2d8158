"""Photon rings resolved: cuts, what each order is, and what an interferometer sees of it."""
