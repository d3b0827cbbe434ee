"""Design a carrier's network: which links to operate, which stations act as hubs, with a proven bound."""

__version__ = "0.1.0"
