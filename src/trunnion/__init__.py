"""Trunnion: calculation notebooks and packages for vehicle and instrument attitude."""

__version__ = "0.1.0"
