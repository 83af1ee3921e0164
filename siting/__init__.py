"""Where small low plots could be cropped on run-on in dry country, and how sure that is."""

__version__ = "0.1.0"
