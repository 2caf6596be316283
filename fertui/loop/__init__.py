"""Physics of one recirculating loop on arrays: uptake, circulation, simulation, account. Knows chemistry alone."""
