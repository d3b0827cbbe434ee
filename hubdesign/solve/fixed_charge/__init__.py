"""Fixed-charge network design: links with a fixed cost and capacities, no fleet, any number of transfers."""
