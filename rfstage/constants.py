"""Numbers that several rooms go by. Standard library only."""

SAFE_VOLTAGE = 60.0  # V dc: above it a touch is dangerous (common practice, no source)

# Where nothing else is known of what cools a stage
AMBIENT = 40.0  # degC, of the air in a cabinet (common practice, no source)
JUNCTION_LIMIT = 150.0  # degC, silicon in plastic, as in the worked examples of Sedra & Smith
CASE_TO_SINK = 0.3  # K/W, a flange with a washer and paste (common practice, no source)
