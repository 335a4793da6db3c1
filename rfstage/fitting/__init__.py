"""From a design to the parts bin: coils to wind, capacitors to buy, and the stage as it is with them."""
