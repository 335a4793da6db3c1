"""rfstage: tuned power stages of radio transmitters, from carrier and power to parts and harmonics."""
