"""The decision model as arrays: variables, constraint families, objective."""
