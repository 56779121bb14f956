"""The science of Bankside: numbers in, numbers out.

Everything inside is SI with the unit in the name (km for distance along the river, days for kinetics, °C for
temperature, mmHg for air pressure because the trade reads it so); rates are base e and per day. Arguments are floats
or array_likes that broadcast as numpy does; a missing value is NaN and passes through; a value outside the valid
range raises and is never clipped. Nothing here reads a clock, a file, the environment or a database.
"""
