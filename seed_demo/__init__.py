"""An invented workshop: its recipes as files, and a player that does its job over the REST API.

Every person, customer, lot and number in here is invented.
"""
