"""Real parts: coils to wind, capacitors to buy, heat sinks and bleeders; one room a kind of part."""
