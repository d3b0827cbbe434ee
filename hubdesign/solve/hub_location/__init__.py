"""Hub location without link costs, capacities or a fleet: proven by duals in closed form."""
