"""Ginnel: a long-term occupancy and traffic-counting log for continuous-wave Doppler radar modules."""

__version__ = "0.1.0"
