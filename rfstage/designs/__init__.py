"""From a job to a stage: the book's design, exact with its losses."""
