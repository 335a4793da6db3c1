"""What a person reads: sections of text for the terminal, built first and printed by the console."""
