"""The invented scenario: a flight model, sensors and writers that make logs whose truth is known.

Nothing here imports the program under test: what it checks must come from somewhere else.
Every aeroplane, operator, place and recorder in it is invented.
"""
