"""The ways to an answer: which engine serves which problem, and the engines."""
