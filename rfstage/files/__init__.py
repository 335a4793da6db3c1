"""Job, stage, load and Touchstone files, JSON records, and the one way anything is written."""
