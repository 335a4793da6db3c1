"""Networks between device and load: one room a network for its closed form, ``exact`` for the losses."""
