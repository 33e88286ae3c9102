"""How many machines of one design meet the limits when parts and materials scatter."""
