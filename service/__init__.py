"""The service: a workshop's coil winding jobs, from recipe to judged coil."""
